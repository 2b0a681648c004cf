-- The small number under which every table keeps a site.
create table site (
  number bigint not null primary key,
  id     bytea   not null unique check (octet_length(id) = 16),
  code   text    not null unique,
  origin text    not null unique
);

-- What the projection tables were made from.
create table projection_version (
  one     bigint not null primary key check (one = 1),
  version text    not null
);

-- The hash of the token that may found a site.
create table founding_token (
  one        bigint not null primary key check (one = 1),
  token_hash bytea   not null
);
