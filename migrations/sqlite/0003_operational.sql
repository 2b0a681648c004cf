-- The small number under which every table keeps a site.
create table site (
  number integer not null primary key,
  id     blob    not null unique check (length(id) = 16),
  code   text    not null unique,
  origin text    not null unique
) strict;

-- What the projection tables were made from.
create table projection_version (
  one     integer not null primary key check (one = 1),
  version text    not null
) strict;

-- The hash of the token that may found a site.
create table founding_token (
  one        integer not null primary key check (one = 1),
  token_hash blob    not null
) strict;
