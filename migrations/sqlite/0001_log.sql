-- The log: the only truth about the cellar. Times are microseconds since 1970-01-01T00:00:00Z.
create table log_head (
  site             integer not null primary key,
  size             integer not null check (size >= 0),
  frontier         blob    not null,
  root             blob    not null check (length(root) = 32),
  note             text    not null,
  last_recorded_at integer not null
) strict;

-- Not "without rowid": entries of 1 kB made such a table more than three times as large.
create table entry (
  site      integer not null,
  seq       integer not null check (seq >= 0),
  bytes     blob    not null check (length(bytes) between 2 and 65535),
  leaf_hash blob    not null check (length(leaf_hash) = 32),
  primary key (site, seq)
) strict;

create table tile (
  site   integer not null,
  level  integer not null check (level between 1 and 7),
  idx    integer not null check (idx >= 0),
  hashes blob    not null check (length(hashes) = 8192),
  primary key (site, level, idx)
) strict;

create table blob (
  site       integer not null,
  digest     blob    not null check (length(digest) = 32),
  media_type text    not null,
  bytes      blob    not null check (length(bytes) <= 10485760),
  primary key (site, digest)
) strict;

-- Heads that left the house.
create table signed_head (
  site integer not null,
  size integer not null check (size >= 0),
  root blob    not null check (length(root) = 32),
  note text    not null,
  primary key (site, size)
) strict;

create trigger entry_no_update before update on entry begin select raise(abort, 'entry is append-only'); end;
create trigger entry_no_delete before delete on entry begin select raise(abort, 'entry is append-only'); end;
-- "insert or replace" deletes without firing the delete trigger, so a second row of one key is refused here.
create trigger entry_no_replace before insert on entry
  when exists (select 1 from entry where site = new.site and seq = new.seq)
  begin select raise(abort, 'entry is append-only'); end;

create trigger tile_no_update before update on tile begin select raise(abort, 'tile is append-only'); end;
create trigger tile_no_delete before delete on tile begin select raise(abort, 'tile is append-only'); end;
create trigger tile_no_replace before insert on tile
  when exists (select 1 from tile where site = new.site and level = new.level and idx = new.idx)
  begin select raise(abort, 'tile is append-only'); end;

create trigger blob_no_update before update on blob begin select raise(abort, 'blob is append-only'); end;
create trigger blob_no_delete before delete on blob begin select raise(abort, 'blob is append-only'); end;
create trigger blob_no_replace before insert on blob
  when exists (select 1 from blob where site = new.site and digest = new.digest)
  begin select raise(abort, 'blob is append-only'); end;

create trigger signed_head_no_update before update on signed_head begin select raise(abort, 'signed_head is append-only'); end;
create trigger signed_head_no_delete before delete on signed_head begin select raise(abort, 'signed_head is append-only'); end;
create trigger signed_head_no_replace before insert on signed_head
  when exists (select 1 from signed_head where site = new.site and size = new.size)
  begin select raise(abort, 'signed_head is append-only'); end;
