-- As people read: A beside a, an accent beside its letter, "House 2" before "House 10".
create collation reading_order (provider = icu, locale = 'und-u-kn-true');

create type verdict as enum ('within', 'caution', 'unconfirmed', 'outside'); -- from best to worst

-- A design as lists show it: its newest revision in short. Texts that are longer than
-- a list can show are cut here; the revision's document has them whole.
create table design (
    id text collate "C" not null,
    title text collate reading_order not null,
    site text not null,
    revision integer not null, -- the newest one's number
    verdict verdict not null,
    headroom_c numeric not null, -- rounded down to nine places; -Infinity where it is not known
    words tsvector not null,     -- by which it is found
    created_at timestamptz not null default now(),
    created_by text not null,
    created_by_name text not null,
    updated_at timestamptz not null default now(),
    updated_by text not null,
    updated_by_name text not null,
    archived_at timestamptz,
    archived_by text,
    archived_by_name text,
    constraint design_pkey primary key (id),
    constraint design_id_check check (id <> ''),
    constraint design_revision_check check (revision >= 1),
    constraint design_actor_check check (created_by <> '' and updated_by <> '' and archived_by <> ''),
    constraint design_archived_check check (num_nulls(archived_at, archived_by, archived_by_name) in (0, 3))
);

create index design_updated_idx on design (updated_at, id);
create index design_title_idx on design (title, id);
create index design_verdict_idx on design (verdict, updated_at, id);
create index design_headroom_idx on design (headroom_c, id);
create index design_words_idx on design using gin (words);

-- A design as it was saved once. It never changes.
create table revision (
    design text collate "C" not null,
    number integer not null,
    base integer not null, -- the revision it was made from, 0 for the first
    document bytea not null, -- canonical JSON, byte for byte
    result bytea not null,   -- JSON as the engine wrote it then
    sha256 bytea not null,   -- of document
    engine text not null,
    rulebook text not null,
    title text not null,
    site text not null,
    verdict verdict not null,
    headroom_c numeric not null, -- as in design
    note text not null,
    saved_at timestamptz not null default now(),
    saved_by text not null,
    saved_by_name text not null,
    constraint revision_pkey primary key (design, number),
    constraint revision_design_fkey foreign key (design) references design (id),
    constraint revision_number_check check (number >= 1),
    constraint revision_base_check check (base >= 0 and base < number),
    constraint revision_document_check check (document <> '' and result <> ''),
    constraint revision_sha256_check check (sha256 = sha256(document)),
    constraint revision_actor_check check (saved_by <> '')
);

alter table design add constraint design_newest_fkey
    foreign key (id, revision) references revision (design, number) deferrable initially deferred;

-- What a revision uses, in the order of its document.
create table revision_use (
    design text collate "C" not null,
    number integer not null,
    place integer not null,
    kind text not null,
    maker text not null,
    model text not null,
    sought text collate "C" not null, -- maker and model in lower case with single spaces, as where-used looks for them
    constraint revision_use_pkey primary key (design, number, place),
    constraint revision_use_revision_fkey foreign key (design, number) references revision (design, number),
    constraint revision_use_kind_check check (kind in ('module', 'inverter'))
);

create index revision_use_sought_idx on revision_use (sought, kind, design, number);

create function refuse_change() returns trigger language plpgsql as $$
begin
    raise exception 'what was saved in % never changes', tg_table_name using errcode = 'restrict_violation';
end
$$;

create trigger revision_never_changes before update or delete or truncate on revision
    for each statement execute function refuse_change();
create trigger revision_use_never_changes before update or delete or truncate on revision_use
    for each statement execute function refuse_change();
