-- The log: the only truth about the cellar. Times are microseconds since 1970-01-01T00:00:00Z.
create table log_head (
  site             bigint not null primary key,
  size             bigint not null check (size >= 0),
  frontier         bytea  not null,
  root             bytea  not null check (octet_length(root) = 32),
  note             text   not null,
  last_recorded_at bigint not null
);

create table entry (
  site      bigint not null,
  seq       bigint not null check (seq >= 0),
  bytes     bytea  not null check (octet_length(bytes) between 2 and 65535),
  leaf_hash bytea  not null check (octet_length(leaf_hash) = 32),
  primary key (site, seq)
);

create table tile (
  site   bigint not null,
  level  bigint not null check (level between 1 and 7),
  idx    bigint not null check (idx >= 0),
  hashes bytea  not null check (octet_length(hashes) = 8192),
  primary key (site, level, idx)
);

create table blob (
  site       bigint not null,
  digest     bytea  not null check (octet_length(digest) = 32),
  media_type text   not null,
  bytes      bytea  not null check (octet_length(bytes) <= 10485760),
  primary key (site, digest)
);

-- Heads that left the house.
create table signed_head (
  site bigint not null,
  size bigint not null check (size >= 0),
  root bytea  not null check (octet_length(root) = 32),
  note text   not null,
  primary key (site, size)
);

create function append_only() returns trigger language plpgsql as $$
begin
  raise exception '% is append-only', tg_table_name using errcode = 'restrict_violation';
end $$;

create trigger entry_no_change before update or delete or truncate on entry
  for each statement execute function append_only();
create trigger tile_no_change before update or delete or truncate on tile
  for each statement execute function append_only();
create trigger blob_no_change before update or delete or truncate on blob
  for each statement execute function append_only();
create trigger signed_head_no_change before update or delete or truncate on signed_head
  for each statement execute function append_only();
