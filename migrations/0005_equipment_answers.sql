-- Why a value of kept equipment that looks like a slip is right.
alter table equipment
    add column answers bytea not null default '[]'; -- JSON: [{"pointer": inside document, "value_asked": its JSON as a text, "reason"}]
