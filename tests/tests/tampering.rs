//! Whoever has the database in hand can alter it, but not unseen.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use tests::{Cellar, Engine, Home, on_both_engines};

/// Removes the guard on the log, as the database's owner can.
fn disarm(home: &Home) {
    home.sql(match home.engine() {
        Engine::Sqlite => "drop trigger entry_no_update; drop trigger entry_no_delete",
        Engine::Postgres => "alter table entry disable trigger all",
    });
}

/// The canonical bytes of an entry with 1.0940 read as 1.0930.
fn reworded(engine: Engine) -> &'static str {
    match engine {
        Engine::Sqlite => "cast(replace(cast(bytes as text), '1.0940', '1.0930') as blob)",
        Engine::Postgres => {
            "convert_to(replace(convert_from(bytes, 'UTF8'), '1.0940', '1.0930'), 'UTF8')"
        }
    }
}

/// A book with a gravity of 1.0940 in it, and that entry's number.
fn book(engine: Engine) -> (Cellar, u64) {
    let mut cellar = Cellar::simulated(engine);
    let lot = cellar.receive("DP-0412", "DAP", "25", "kg");
    let batch = cellar.open("B1", "3000", "L");
    let seq = cellar.gravity(&batch, "1.0940").number("/entries/0/seq");
    cellar.add_unasked(&batch, &[(&lot, "300", "g")]).expect(201);
    cellar.deep_check();
    (cellar, seq)
}

on_both_engines! {
    fn the_log_refuses_to_be_altered_as_long_as_its_guard_stands(engine) {
        let (cellar, seq) = book(engine);
        let home = cellar.program.home().clone();
        for statement in [
            format!("update entry set bytes = bytes where seq = {seq}"),
            format!("delete from entry where seq = {seq}"),
        ] {
            let tried = std::panic::catch_unwind(|| home.sql(&statement));
            let said = *tried.expect_err(&statement).downcast::<String>().unwrap();
            assert!(said.contains("append-only"), "{said}");
        }
        cellar.deep_check();
    }

    fn an_altered_entry_is_named_by_verify(engine) {
        let (mut cellar, seq) = book(engine);
        assert!(cellar.program.terminate().success());
        let home = cellar.program.home();
        disarm(home);
        home.sql(&format!("update entry set bytes = {} where seq = {seq}", reworded(engine)));
        let verified = home.run(&["verify"]).expect_code(1);
        assert!(verified.printed.contains("NOT WHOLE"), "{}", verified.printed);
        assert!(verified.printed.contains(&format!("entry {seq}:")), "{}", verified.printed);
    }

    fn a_missing_entry_is_named_by_verify(engine) {
        let (mut cellar, seq) = book(engine);
        assert!(cellar.program.terminate().success());
        let home = cellar.program.home();
        disarm(home);
        home.sql(&format!("delete from entry where seq = {seq}"));
        let verified = home.run(&["verify"]).expect_code(1);
        assert!(verified.printed.contains(&format!("entry {seq}:")), "{}", verified.printed);
    }

    fn an_altered_table_is_named_by_its_key_and_mended_by_rebuild(engine) {
        let (mut cellar, _) = book(engine);
        let lot = cellar.id("DP-0412").to_owned();
        assert_eq!(cellar.remaining(&lot), 24_700_000_000);
        assert!(cellar.program.terminate().success());
        let home = cellar.program.home();
        home.sql("update lot set remaining_base = remaining_base + 1");
        let compared = home.run(&["rebuild", "--check"]).expect_code(1);
        let key = lot.replace('-', "");
        let line = compared.printed.lines().find(|line| line.contains("lot ("));
        let line = line.unwrap_or_else(|| panic!("{}", compared.printed));
        assert!(line.replace('-', "").contains(&key), "{line}");
        assert!(line.contains("remaining_base differs"), "{line}");
        home.run(&["verify"]).expect_success();
        home.run(&["rebuild"]).expect_success();
        tests::cellar::deep_check(home);
    }

    fn every_row_that_is_missing_or_invented_is_found(engine) {
        let (mut cellar, _) = book(engine);
        assert!(cellar.program.terminate().success());
        let home = cellar.program.home();
        for (statement, table) in [
            ("delete from reading", "reading ("),
            ("delete from leg where leg = 0", "leg ("),
            ("update subject set n = n + 1", "subject ("),
            ("update command set entries = entries + 1", "command ("),
            ("update code set code = 'B2' where code = 'B1'", "code ("),
        ] {
            home.sql(statement);
            let compared = home.run(&["rebuild", "--check"]).expect_code(1);
            assert!(compared.printed.contains(table), "{statement}: {}", compared.printed);
            home.run(&["rebuild"]).expect_success();
            tests::cellar::deep_check(home);
        }
    }
}
