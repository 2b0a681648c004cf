//! Ids for one command.

use uuid::Uuid;

/// The ids of one command: each time it is decided it draws the same ones, so that what it asks for comes to an end.
pub(super) struct Drawn<'a> {
    draw: &'a (dyn Fn() -> Uuid + Send + Sync),
    ids: Vec<Uuid>,
}

impl<'a> Drawn<'a> {
    pub(super) const fn new(draw: &'a (dyn Fn() -> Uuid + Send + Sync)) -> Self {
        Self { draw, ids: Vec::new() }
    }

    pub(super) fn anew(&mut self) -> impl FnMut() -> Uuid + use<'_, 'a> {
        let mut next = 0;
        move || {
            if next == self.ids.len() {
                self.ids.push((self.draw)());
            }
            next += 1;
            self.ids[next - 1]
        }
    }
}

#[cfg(test)]
mod tests {
    use std::sync::atomic::{AtomicU64, Ordering};

    use super::*;

    #[test]
    fn each_round_draws_the_same_ids() {
        let next = AtomicU64::new(1);
        let draw = || Uuid::from_u128(next.fetch_add(1, Ordering::Relaxed).into());
        let mut drawn = Drawn::new(&draw);
        let first = {
            let mut round = drawn.anew();
            [round(), round()]
        };
        let mut round = drawn.anew();
        assert_eq!([round(), round()], first);
        assert_ne!(round(), first[1]);
    }
}
