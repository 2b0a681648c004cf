-- Names and secrets of persons, outside the log: erasing a person erases this row and leaves every proof valid.
create table directory_person (
  site          integer not null,
  person        blob    not null check (length(person) = 16),
  login         text    not null,
  name          text    not null,
  password_hash text    not null,
  salt          blob    not null,
  primary key (site, person),
  unique (site, login)
) strict;
