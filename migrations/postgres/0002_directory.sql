-- Names and secrets of persons, outside the log: erasing a person erases this row and leaves every proof valid.
create table directory_person (
  site          bigint not null,
  person        bytea   not null check (octet_length(person) = 16),
  login         text    not null,
  name          text    not null,
  password_hash text    not null,
  salt          bytea   not null,
  primary key (site, person),
  unique (site, login)
);
