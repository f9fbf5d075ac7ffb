-- Saves that were done under a request key, so that a repeated one makes nothing new.
create table save_request (
    actor text not null,
    key text not null,
    content bytea not null, -- SHA-256 of what was asked
    made text not null,     -- the id of the design or equipment that was saved
    number bigint not null, -- its revision or version
    done_at timestamptz not null default now(),
    constraint save_request_pkey primary key (actor, key),
    constraint save_request_key_check check (key <> '' and length(key) <= 255),
    constraint save_request_actor_check check (actor <> '')
);

create index save_request_done_idx on save_request (done_at);

-- Answers over HTTP that were given under a request key.
create table answer (
    actor text not null,
    key text not null,
    request bytea not null, -- SHA-256 of what was asked
    status integer not null,
    header text not null,   -- name=text&..., percent-encoded
    body bytea not null,
    given_at timestamptz not null default now(),
    constraint answer_pkey primary key (actor, key),
    constraint answer_key_check check (key <> '' and length(key) <= 255),
    constraint answer_status_check check (status between 200 and 599),
    constraint answer_actor_check check (actor <> '')
);

create index answer_given_idx on answer (given_at);
