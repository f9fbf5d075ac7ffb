-- What the migrations come to; made by: go test ./server/store -run Schema -update
CREATE COLLATION public.reading_order (provider = icu, locale = 'und-u-kn-true');

CREATE TYPE public.verdict AS ENUM (
    'within',
    'caution',
    'unconfirmed',
    'outside'
);

CREATE FUNCTION public.refuse_change() RETURNS trigger
    LANGUAGE plpgsql
    AS $$
begin
    raise exception 'what was saved in % never changes', tg_table_name using errcode = 'restrict_violation';
end
$$;

CREATE TABLE public.answer (
    actor text NOT NULL,
    key text NOT NULL,
    request bytea NOT NULL,
    status integer NOT NULL,
    header text NOT NULL,
    body bytea NOT NULL,
    given_at timestamp with time zone DEFAULT now() NOT NULL,
    CONSTRAINT answer_actor_check CHECK ((actor <> ''::text)),
    CONSTRAINT answer_key_check CHECK (((key <> ''::text) AND (length(key) <= 255))),
    CONSTRAINT answer_status_check CHECK (((status >= 200) AND (status <= 599)))
);

CREATE TABLE public.design (
    id text NOT NULL COLLATE pg_catalog."C",
    title text NOT NULL COLLATE public.reading_order,
    site text NOT NULL,
    revision integer NOT NULL,
    verdict public.verdict NOT NULL,
    headroom_c numeric NOT NULL,
    words tsvector NOT NULL,
    created_at timestamp with time zone DEFAULT now() NOT NULL,
    created_by text NOT NULL,
    created_by_name text NOT NULL,
    updated_at timestamp with time zone DEFAULT now() NOT NULL,
    updated_by text NOT NULL,
    updated_by_name text NOT NULL,
    archived_at timestamp with time zone,
    archived_by text,
    archived_by_name text,
    CONSTRAINT design_actor_check CHECK (((created_by <> ''::text) AND (updated_by <> ''::text) AND (archived_by <> ''::text))),
    CONSTRAINT design_archived_check CHECK ((num_nulls(archived_at, archived_by, archived_by_name) = ANY (ARRAY[0, 3]))),
    CONSTRAINT design_id_check CHECK ((id <> ''::text)),
    CONSTRAINT design_revision_check CHECK ((revision >= 1))
);

CREATE TABLE public.draft (
    id text NOT NULL COLLATE pg_catalog."C",
    design text COLLATE pg_catalog."C",
    base integer NOT NULL,
    fields text NOT NULL,
    version bigint NOT NULL,
    created_at timestamp with time zone DEFAULT now() NOT NULL,
    created_by text NOT NULL,
    created_by_name text NOT NULL,
    saved_at timestamp with time zone DEFAULT now() NOT NULL,
    saved_by text NOT NULL,
    saved_by_name text NOT NULL,
    CONSTRAINT draft_actor_check CHECK (((created_by <> ''::text) AND (saved_by <> ''::text))),
    CONSTRAINT draft_base_check CHECK ((base >= 0)),
    CONSTRAINT draft_id_check CHECK ((id <> ''::text)),
    CONSTRAINT draft_version_check CHECK ((version >= 1))
);

CREATE TABLE public.equipment (
    id text NOT NULL COLLATE pg_catalog."C",
    kind text NOT NULL,
    maker text NOT NULL COLLATE public.reading_order,
    model text NOT NULL COLLATE public.reading_order,
    document bytea NOT NULL,
    sources text NOT NULL,
    note text NOT NULL,
    version bigint NOT NULL,
    words tsvector NOT NULL,
    created_at timestamp with time zone DEFAULT now() NOT NULL,
    created_by text NOT NULL,
    created_by_name text NOT NULL,
    updated_at timestamp with time zone DEFAULT now() NOT NULL,
    updated_by text NOT NULL,
    updated_by_name text NOT NULL,
    archived_at timestamp with time zone,
    archived_by text,
    archived_by_name text,
    answers bytea DEFAULT '\x5b5d'::bytea NOT NULL,
    CONSTRAINT equipment_actor_check CHECK (((created_by <> ''::text) AND (updated_by <> ''::text) AND (archived_by <> ''::text))),
    CONSTRAINT equipment_archived_check CHECK ((num_nulls(archived_at, archived_by, archived_by_name) = ANY (ARRAY[0, 3]))),
    CONSTRAINT equipment_document_check CHECK ((document <> '\x'::bytea)),
    CONSTRAINT equipment_id_check CHECK ((id <> ''::text)),
    CONSTRAINT equipment_kind_check CHECK ((kind = ANY (ARRAY['module'::text, 'inverter'::text]))),
    CONSTRAINT equipment_version_check CHECK ((version >= 1))
);

CREATE TABLE public.migration (
    name text NOT NULL COLLATE pg_catalog."C",
    sha256 bytea NOT NULL,
    applied_at timestamp with time zone DEFAULT now() NOT NULL
);

CREATE TABLE public.revision (
    design text NOT NULL COLLATE pg_catalog."C",
    number integer NOT NULL,
    base integer NOT NULL,
    document bytea NOT NULL,
    result bytea NOT NULL,
    sha256 bytea NOT NULL,
    engine text NOT NULL,
    rulebook text NOT NULL,
    title text NOT NULL,
    site text NOT NULL,
    verdict public.verdict NOT NULL,
    headroom_c numeric NOT NULL,
    note text NOT NULL,
    saved_at timestamp with time zone DEFAULT now() NOT NULL,
    saved_by text NOT NULL,
    saved_by_name text NOT NULL,
    CONSTRAINT revision_actor_check CHECK ((saved_by <> ''::text)),
    CONSTRAINT revision_base_check CHECK (((base >= 0) AND (base < number))),
    CONSTRAINT revision_document_check CHECK (((document <> '\x'::bytea) AND (result <> '\x'::bytea))),
    CONSTRAINT revision_number_check CHECK ((number >= 1)),
    CONSTRAINT revision_sha256_check CHECK ((sha256 = sha256(document)))
);

CREATE TABLE public.revision_use (
    design text NOT NULL COLLATE pg_catalog."C",
    number integer NOT NULL,
    place integer NOT NULL,
    kind text NOT NULL,
    maker text NOT NULL,
    model text NOT NULL,
    sought text NOT NULL COLLATE pg_catalog."C",
    CONSTRAINT revision_use_kind_check CHECK ((kind = ANY (ARRAY['module'::text, 'inverter'::text])))
);

CREATE TABLE public.save_request (
    actor text NOT NULL,
    key text NOT NULL,
    content bytea NOT NULL,
    made text NOT NULL,
    number bigint NOT NULL,
    done_at timestamp with time zone DEFAULT now() NOT NULL,
    CONSTRAINT save_request_actor_check CHECK ((actor <> ''::text)),
    CONSTRAINT save_request_key_check CHECK (((key <> ''::text) AND (length(key) <= 255)))
);

ALTER TABLE ONLY public.answer
    ADD CONSTRAINT answer_pkey PRIMARY KEY (actor, key);

ALTER TABLE ONLY public.design
    ADD CONSTRAINT design_pkey PRIMARY KEY (id);

ALTER TABLE ONLY public.draft
    ADD CONSTRAINT draft_pkey PRIMARY KEY (id);

ALTER TABLE ONLY public.equipment
    ADD CONSTRAINT equipment_pkey PRIMARY KEY (id);

ALTER TABLE ONLY public.migration
    ADD CONSTRAINT migration_pkey PRIMARY KEY (name);

ALTER TABLE ONLY public.revision
    ADD CONSTRAINT revision_pkey PRIMARY KEY (design, number);

ALTER TABLE ONLY public.revision_use
    ADD CONSTRAINT revision_use_pkey PRIMARY KEY (design, number, place);

ALTER TABLE ONLY public.save_request
    ADD CONSTRAINT save_request_pkey PRIMARY KEY (actor, key);

CREATE INDEX answer_given_idx ON public.answer USING btree (given_at);

CREATE INDEX design_headroom_idx ON public.design USING btree (headroom_c, id);

CREATE INDEX design_title_idx ON public.design USING btree (title, id);

CREATE INDEX design_updated_idx ON public.design USING btree (updated_at, id);

CREATE INDEX design_verdict_idx ON public.design USING btree (verdict, updated_at, id);

CREATE INDEX design_words_idx ON public.design USING gin (words);

CREATE INDEX draft_design_idx ON public.draft USING btree (design, saved_at, id);

CREATE INDEX draft_saved_idx ON public.draft USING btree (saved_at, id);

CREATE INDEX equipment_name_idx ON public.equipment USING btree (maker, model, id);

CREATE INDEX equipment_updated_idx ON public.equipment USING btree (updated_at, id);

CREATE INDEX equipment_words_idx ON public.equipment USING gin (words);

CREATE INDEX revision_use_sought_idx ON public.revision_use USING btree (sought, kind, design, number);

CREATE INDEX save_request_done_idx ON public.save_request USING btree (done_at);

CREATE TRIGGER revision_never_changes BEFORE DELETE OR UPDATE OR TRUNCATE ON public.revision FOR EACH STATEMENT EXECUTE FUNCTION public.refuse_change();

CREATE TRIGGER revision_use_never_changes BEFORE DELETE OR UPDATE OR TRUNCATE ON public.revision_use FOR EACH STATEMENT EXECUTE FUNCTION public.refuse_change();

ALTER TABLE ONLY public.design
    ADD CONSTRAINT design_newest_fkey FOREIGN KEY (id, revision) REFERENCES public.revision(design, number) DEFERRABLE INITIALLY DEFERRED;

ALTER TABLE ONLY public.draft
    ADD CONSTRAINT draft_design_fkey FOREIGN KEY (design) REFERENCES public.design(id);

ALTER TABLE ONLY public.revision
    ADD CONSTRAINT revision_design_fkey FOREIGN KEY (design) REFERENCES public.design(id);

ALTER TABLE ONLY public.revision_use
    ADD CONSTRAINT revision_use_revision_fkey FOREIGN KEY (design, number) REFERENCES public.revision(design, number);
