//! The writer: groups, refusals, repeats, failures.

use std::collections::BTreeSet;
use std::sync::Arc;
use std::sync::atomic::Ordering;
use std::time::Duration;

use domain::book::Desk;
use domain::book::command::{Act, Amend, AmendTo, CorrectClock, DirectoryPerson, Enrol};
use domain::ids::{BatchId, PersonId};
use domain::ledger::tree::{Hash, TreeHead};
use domain::stamp::{Micros, Stamp};
use uuid::Uuid;

use super::acts::{self, at, batch, open_batch, open_deviation, reading, value_of};
use super::append_only::run;
use super::book::{Book, START, on_both, site_id, tools};
use crate::writer::{GROUP, WriteError, Writers};
use crate::{Db, directory};

fn unknown_batch() -> BatchId {
    BatchId(Uuid::from_u128(1))
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn commands_that_wait_together_are_committed_together() {
    on_both(async |book| {
        acts::furnish(book).await;
        let (commits, size) = (book.writers.counters().commits(), book.size().await);
        let commands = (0..200).map(|i| book.command(reading(batch(), &format!("3.{i:03}"))));
        let answers = book.together(commands.collect()).await;

        let seqs: BTreeSet<u64> =
            answers.into_iter().map(|answer| answer.unwrap().entries[0].seq).collect();
        assert_eq!(seqs, (size..size + 200).collect());
        let commits = book.writers.counters().commits() - commits;
        assert!(commits <= 50, "{commits} commits for 200 commands");
        assert_eq!(book.writers.counters().entries(), size + 200);
        assert_eq!(book.committed.lock().unwrap().last(), Some(&(size + 200)));
        book.deep_check().await;
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_refusal_leaves_the_rest_of_its_group_untouched() {
    on_both(async |book| {
        acts::furnish(book).await;
        let size = book.size().await;
        let commands = (0..60).map(|i| {
            let of = if i % 3 == 0 { unknown_batch() } else { batch() };
            book.command(reading(of, "3.5"))
        });
        let answers = book.together(commands.collect()).await;

        for (i, answer) in answers.iter().enumerate() {
            let is_refused = matches!(answer, Err(WriteError::Refused(_)));
            assert_eq!(is_refused, i % 3 == 0, "{i}: {answer:?}");
        }
        assert_eq!(book.size().await, size + 40);
        assert_eq!(book.writers.counters().retries(), 0);
        book.deep_check().await;
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn each_command_is_decided_on_the_state_after_the_ones_before_it() {
    on_both(async |book| {
        acts::furnish(book).await;
        let opened =
            |number: u128| book.command(open_batch(BatchId(Uuid::from_u128(number)), "B2"));
        let answers = book.together((2..22).map(opened).collect()).await;
        assert_eq!(
            answers.iter().filter(|answer| answer.is_ok()).count(),
            1,
            "one code, one batch"
        );
        book.deep_check().await;
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_repeat_gives_the_first_answer_and_writes_nothing() {
    on_both(async |book| {
        acts::furnish(book).await;
        let command = book.command(reading(batch(), "3.6"));
        let first = book.submit(command.clone()).await.unwrap();
        book.act(reading(batch(), "3.7")).await.unwrap();
        let size = book.size().await;

        let again = book.submit(command.clone()).await.unwrap();
        assert_eq!(again.entries, first.entries);
        let mut other = command.clone();
        other.print = [9; 32];
        assert!(matches!(book.submit(other).await, Err(WriteError::KeyReused)));
        assert_eq!(book.size().await, size);

        let fresh = book.command(reading(batch(), "3.8"));
        let mut answers = book.together(vec![fresh.clone(); 20]).await;
        let first = answers.pop().unwrap().unwrap();
        for answer in answers {
            assert_eq!(answer.unwrap().entries, first.entries);
        }
        assert_eq!(book.size().await, size + 1);
        book.deep_check().await;
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_command_on_which_the_program_fails_harms_no_other() {
    on_both(async |book| {
        acts::furnish(book).await;
        let size = book.size().await;
        book.fuse.store(7, Ordering::Relaxed);
        let commands = (0..20).map(|_| book.command(reading(batch(), "3.5"))).collect();
        let answers = book.together(commands).await;

        let failed = answers.iter().filter(|a| matches!(a, Err(WriteError::Failed(_)))).count();
        assert_eq!(failed, 1, "{answers:?}");
        assert_eq!(book.size().await, size + 19);
        book.deep_check().await;
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_group_that_the_database_refuses_is_done_one_by_one() {
    on_both(async |book| {
        acts::furnish(book).await;
        let owner = book.ground.owner().await;
        let trap = match owner {
            Db::Sqlite { .. } => {
                "create trigger trap before insert on deviation when new.code = 'D10' \
                 begin select raise(abort, 'trapped'); end"
            }
            Db::Postgres(_) => "alter table deviation add check (code <> 'D10')",
        };
        run(&owner, trap).await.unwrap();
        owner.close().await;
        let size = book.size().await;
        let open = |i| book.command(open_deviation(i, &format!("D{i}")));
        let answers = book.together((0..20).map(open).collect()).await;

        for (i, answer) in answers.iter().enumerate() {
            assert_eq!(answer.is_err(), i == 10, "{i}: {answer:?}");
        }
        assert!(matches!(answers[10], Err(WriteError::Store(_))));
        assert!(book.writers.counters().retries() <= 1);
        assert_eq!(book.size().await, size + 19);
        book.deep_check().await;
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn one_login_is_one_persons() {
    on_both(async |book| {
        let enrol = |number: u128, login: &str| {
            let person = DirectoryPerson {
                person: PersonId(Uuid::from_u128(number)),
                login: login.to_owned(),
                name: "Bo".to_owned(),
                password_hash: "none".to_owned(),
                salt: vec![2; 16],
            };
            book.command(Act::Enrol(Enrol { person, roles: Vec::new() }))
        };
        let logins = ["ada", "bo", "bo", "bo", "cy"];
        let commands = (1..).zip(logins).map(|(number, login)| enrol(number, login));
        let answers = book.together(commands.collect()).await;

        let is_refused = |a: &&Result<_, _>| matches!(a, Err(WriteError::Refused(_)));
        assert_eq!(answers.iter().filter(is_refused).count(), 3, "{answers:?}");
        assert!(answers[0].is_err(), "ada founded the book");
        let mut held = book.db.reader().await.unwrap();
        let (mut conn, site) = (held.conn(), book.site.number);
        let cy = directory::by_login(&mut conn, site, "cy").await.unwrap();
        assert_eq!(cy.unwrap().id, PersonId(Uuid::from_u128(5)));
        assert_eq!(directory::all(&mut conn, site).await.unwrap().len(), 3);
        drop(held);
        book.deep_check().await;
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_client_that_hangs_up_does_not_undo_its_command() {
    on_both(async |book| {
        acts::furnish(book).await;
        let size = book.size().await;
        let asked = book.act(reading(batch(), "3.5"));
        let answer = tokio::time::timeout(Duration::ZERO, asked).await;
        assert!(answer.is_err(), "the client did not wait");
        book.writers.close().await;
        assert_eq!(book.size().await, size + 1);
        assert!(matches!(book.act(reading(batch(), "3.5")).await, Err(WriteError::Closing)));
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn two_programs_on_one_database_never_write_on_what_the_other_changed() {
    on_both(async |book| {
        acts::furnish(book).await;
        let size = book.size().await;
        let other_db = book.ground.serving().await;
        let other = Writers::new(other_db, tools(1, &book.clock, &book.committed, &book.fuse));
        let mut tasks = Vec::new();
        for i in 0..60 {
            let writers = if i % 2 == 0 { book.writers.clone() } else { other.clone() };
            let command = book.command(reading(batch(), "3.5"));
            let id = book.site.id;
            tasks.push(tokio::spawn(async move { writers.submit(id, command).await }));
            tokio::time::sleep(Duration::from_millis(1)).await;
        }
        for task in tasks {
            task.await.unwrap().unwrap();
        }
        other.close().await;
        assert_eq!(book.size().await, size + 60);
        book.deep_check().await;
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn what_another_program_changed_is_noticed_however_long_it_lay() {
    on_both(async |book| {
        acts::furnish(book).await;
        let (seldom, often) = (batch(), BatchId(Uuid::from_u128(0xbb << 120)));
        book.act(open_batch(often, "B2")).await.unwrap();
        let other = Writers::new(
            book.ground.serving().await,
            tools(1, &book.clock, &book.committed, &book.fuse),
        );
        for round in 0..3 {
            // Ours has both at hand; the other changes one of them; ours notices, and goes on with the second only.
            book.act(reading(seldom, "3.5")).await.unwrap();
            let theirs = book.command(reading(seldom, "3.6"));
            other.submit(book.site.id, theirs).await.unwrap();
            for _ in 0..2 {
                book.act(reading(often, "3.7")).await.unwrap();
            }
            book.act(reading(seldom, "3.8")).await.unwrap();
            assert_eq!(book.deep_check().await.fault, None, "round {round}");
        }
        other.close().await;
    })
    .await;
}

#[tokio::test]
async fn a_clock_that_goes_back_stops_writing_until_somebody_says_so_in_the_book() {
    on_both(async |book| {
        acts::furnish(book).await;
        book.clock.store(START + 600_000_000, Ordering::Relaxed);
        book.act(reading(batch(), "3.5")).await.unwrap();

        book.clock.store(START + 599_000_000, Ordering::Relaxed);
        let small = book.act(reading(batch(), "3.5")).await.unwrap();
        assert_eq!(small.entries[0].recorded_at, Micros(START + 600_000_000));

        book.clock.store(START + 100_000_000, Ordering::Relaxed);
        let refused = book.act(reading(batch(), "3.5")).await.unwrap_err();
        assert!(matches!(refused, WriteError::ClockBehind { seconds: 500 }), "{refused:?}");
        assert!(refused.is_passing());

        let at = Stamp::new(Micros(START + 100_000_000), 0);
        let correct = CorrectClock { reason: "it was ahead".to_owned(), at };
        book.act(Act::CorrectClock(correct)).await.unwrap();
        book.clock.store(START + 101_000_000, Ordering::Relaxed);
        let after = book.act(reading(batch(), "3.5")).await.unwrap();
        assert_eq!(after.entries[0].recorded_at, Micros(START + 101_000_000));
        book.deep_check().await;
    })
    .await;
}

#[tokio::test]
async fn an_amendment_changes_the_past_and_the_tables_follow() {
    on_both(async |book| {
        acts::furnish(book).await;
        let taken = book.act(reading(batch(), "3.5")).await.unwrap();
        let amend = |effect| {
            Act::Amend(Box::new(Amend {
                target: taken.entries[0].id,
                effect,
                reason: "a slip of the pen".to_owned(),
                amended_at: at(1),
            }))
        };
        book.clock.fetch_add(120_000_000, Ordering::Relaxed);
        book.act(amend(AmendTo::Value(0, Box::new(value_of("3.6"))))).await.unwrap();
        book.deep_check().await;
        book.act(amend(AmendTo::Void)).await.unwrap();
        book.deep_check().await;
    })
    .await;
}

#[tokio::test]
async fn readers_see_a_subject_as_the_counter_says() {
    on_both(async |book| {
        acts::furnish(book).await;
        let published = Arc::clone(book.writers.published());
        let load = async || {
            let mut held = book.db.reader().await.unwrap();
            let (mut desk, subject) = (Desk::new(book.site.id), batch().into());
            let (mut conn, wanted) = (held.conn(), [subject]);
            published.lay_subjects(&mut conn, &book.site, &mut desk, &wanted).await.unwrap();
            Arc::clone(desk.loaded(&subject).unwrap())
        };
        assert_eq!(load().await.n, 1);
        assert!(Arc::ptr_eq(&load().await, &load().await), "folded once");
        book.act(reading(batch(), "3.5")).await.unwrap();
        let loaded = load().await;
        assert_eq!((loaded.n, loaded.entries.len()), (2, 2));
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn more_than_one_group_of_commands_finds_its_way() {
    on_both(async |book| {
        acts::furnish(book).await;
        let commands = (0..GROUP as u128 + 100)
            .map(|i| book.command(open_deviation(i, &format!("D{i}"))))
            .collect();
        for answer in book.together(commands).await {
            answer.unwrap();
        }
        book.deep_check().await;
    })
    .await;
}

#[tokio::test]
async fn a_site_that_nobody_registered_is_unknown() {
    on_both(async |book| {
        let command = book.command(reading(batch(), "3.5"));
        let answer = book.writers.submit(site_id(2), command).await;
        assert!(matches!(answer, Err(WriteError::NoSite)));
    })
    .await;
}

#[tokio::test]
async fn a_head_that_the_key_refuses_is_not_committed() {
    on_both(async |book: &Book| {
        acts::furnish(book).await;
        let size = book.size().await;
        let mut strict = tools(2, &book.clock, &book.committed, &book.fuse);
        strict.sign = Arc::new(|_, _, _| Err("a fork".to_owned()));
        let writers = Writers::new(book.db.clone(), strict);
        let answer = writers.submit(book.site.id, book.command(reading(batch(), "3.5"))).await;
        assert!(matches!(answer, Err(WriteError::Unsigned(_))));
        assert_eq!(book.size().await, size);
        writers.close().await;
    })
    .await;
}

/// What is remembered beside the key, as another writer of the same book finds it.
async fn writes_on(book: &Book, size: u64, root: Hash) -> Result<u64, WriteError> {
    let mut mindful = tools(3, &book.clock, &book.committed, &book.fuse);
    mindful.remembered = Arc::new(move |_| Ok(Some(TreeHead { size, root })));
    let writers = Writers::new(book.db.clone(), mindful);
    let continues = writers.check_continues(&book.site).await;
    let answer = writers.submit(book.site.id, book.command(reading(batch(), "3.5"))).await;
    writers.close().await;
    assert_eq!(continues.is_ok(), answer.is_ok(), "{continues:?}");
    answer.map(|receipt| receipt.entries[0].seq)
}

#[tokio::test]
async fn a_log_that_does_not_continue_what_was_signed_before_is_not_written_on() {
    on_both(async |book: &Book| {
        acts::furnish(book).await;
        let older = book.head().await;
        book.act(reading(batch(), "3.5")).await.unwrap();
        let newest = book.head().await;
        for (size, root) in
            [(newest.size + 1, newest.root), (newest.size, older.root), (older.size, newest.root)]
        {
            let refused = writes_on(book, size, root).await;
            assert!(matches!(refused, Err(WriteError::Unsigned(_))), "{size}: {refused:?}");
        }
        assert_eq!(book.head().await, newest);
        assert_eq!(writes_on(book, newest.size, newest.root).await.unwrap(), newest.size);
        assert_eq!(writes_on(book, older.size, older.root).await.unwrap(), newest.size + 1);
        book.deep_check().await;
    })
    .await;
}
