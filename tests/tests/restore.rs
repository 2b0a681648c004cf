//! A book put back from an older state is noticed at home, by what was signed last beside the key.

use tests::{Cellar, Engine, Program};

/// Method: the file of the book is copied, more is recorded, and the copy is put back while the keys stay.
#[test]
fn a_book_put_back_from_an_older_copy_is_not_opened_under_the_same_key() {
    let mut cellar = Cellar::simulated(Engine::Sqlite);
    let batch = cellar.open("EXW-25-K1", "3000", "L");
    let _ = cellar.program.terminate();
    let home = cellar.program.home().clone();
    let older = std::fs::read(home.file()).unwrap();
    cellar.restart();
    let _ = cellar.gravity(&batch, "1.0900");
    let size = cellar.size();
    let _ = cellar.program.terminate();
    let newer = std::fs::read(home.file()).unwrap();

    std::fs::write(home.file(), older).unwrap();
    let refused = home.run(&["founding-link"]).expect_code(1);
    assert!(refused.complaints.contains("put back from an older state"), "{}", refused.complaints);
    let _ = home.run(&["verify"]).expect_success();

    std::fs::write(home.file(), newer).unwrap();
    let _: Program = {
        cellar.restart();
        assert_eq!(cellar.size(), size);
        cellar.program
    };
}
