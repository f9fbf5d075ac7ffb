-- A form as it stands, complete or not.
create table draft (
    id text collate "C" not null,
    design text collate "C", -- null while the design was never saved
    base integer not null,   -- the revision it started from, 0 for none
    fields text not null,    -- name=text&..., percent-encoded, so that every byte comes back as it was typed
    version bigint not null,
    created_at timestamptz not null default now(),
    created_by text not null,
    created_by_name text not null,
    saved_at timestamptz not null default now(),
    saved_by text not null,
    saved_by_name text not null,
    constraint draft_pkey primary key (id),
    constraint draft_id_check check (id <> ''),
    constraint draft_design_fkey foreign key (design) references design (id),
    constraint draft_base_check check (base >= 0),
    constraint draft_version_check check (version >= 1),
    constraint draft_actor_check check (created_by <> '' and saved_by <> '')
);

create index draft_design_idx on draft (design, saved_at, id);
create index draft_saved_idx on draft (saved_at, id);
