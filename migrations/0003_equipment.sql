-- Modules and inverters that people keep, to copy into designs.
create table equipment (
    id text collate "C" not null,
    kind text not null,
    maker text collate reading_order not null,
    model text collate reading_order not null,
    document bytea not null, -- JSON as it stands in a design, without its id
    sources text not null,   -- pointer=where on the datasheet&..., percent-encoded
    note text not null,
    version bigint not null,
    words tsvector not null, -- by which it is found
    created_at timestamptz not null default now(),
    created_by text not null,
    created_by_name text not null,
    updated_at timestamptz not null default now(),
    updated_by text not null,
    updated_by_name text not null,
    archived_at timestamptz,
    archived_by text,
    archived_by_name text,
    constraint equipment_pkey primary key (id),
    constraint equipment_id_check check (id <> ''),
    constraint equipment_kind_check check (kind in ('module', 'inverter')),
    constraint equipment_document_check check (document <> ''),
    constraint equipment_version_check check (version >= 1),
    constraint equipment_actor_check check (created_by <> '' and updated_by <> '' and archived_by <> ''),
    constraint equipment_archived_check check (num_nulls(archived_at, archived_by, archived_by_name) in (0, 3))
);

create index equipment_name_idx on equipment (maker, model, id);
create index equipment_updated_idx on equipment (updated_at, id);
create index equipment_words_idx on equipment using gin (words);
