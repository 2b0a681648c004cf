//! Which new passwords are accepted.
//!
//! After NIST SP 800-63B: length and a list of foreseeable passwords; no rules about kinds of characters, no expiry.
//! In place of a long list, what such lists are made of is stripped: known words, keyboard rows, sequences,
//! repetitions and the names of the situation. It is no measure of strength: an unlucky choice can still pass.

use zeroize::Zeroizing;

use super::normalised;

/// Fewest code points where the password is the only factor (NIST SP 800-63B, final text 3.1.1).
pub const SHORTEST: usize = 15;
/// Most bytes; ours, only so that a megabyte is not hashed.
pub const LONGEST_BYTES: usize = 1024;

/// Fewest code points that must be left once everything foreseeable is taken away (ours, not from a source).
const FEWEST_UNFORESEEN: usize = 6;

/// Words that lists of common passwords are built from (common practice), the product's own name, and keyboard rows.
/// Longest first, so that a longer word is taken before its parts.
const FORESEEABLE: &[&str] = &[
    "administrator",
    "contraseña",
    "contrasena",
    "fermentation",
    "motdepasse",
    "qwertyuiop",
    "tallystave",
    "qwertzuiop",
    "azertyuiop",
    "changeme",
    "iloveyou",
    "password",
    "passwort",
    "passw0rd",
    "p@ssw0rd",
    "princess",
    "sunshine",
    "asdfghjkl",
    "baseball",
    "football",
    "superman",
    "trustno1",
    "zxcvbnm",
    "welcome",
    "letmein",
    "brewery",
    "ferment",
    "secret",
    "dragon",
    "monkey",
    "shadow",
    "master",
    "qwerty",
    "qwertz",
    "azerty",
    "cellar",
    "winery",
    "admin",
    "asdfg",
    "hello",
    "tally",
    "stave",
    "login",
    "abc",
    "1q2w3e4r5t",
    "1q2w3e4r",
    "1qaz2wsx",
];

/// Why a password is not accepted. The text is meant for the person who chose it.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
pub enum Weakness {
    /// Fewer than [`SHORTEST`] code points.
    #[error(
        "it has {0} characters; at least {SHORTEST} are needed, for example four unrelated words"
    )]
    TooShort(usize),
    /// More than [`LONGEST_BYTES`] bytes.
    #[error("it has {0} bytes; at most {LONGEST_BYTES} are accepted")]
    TooLong(usize),
    /// Made of what an attacker tries first.
    #[error(
        "it is made of common words, sequences, repetitions or names of this place, which are tried first; \
         choose for example four unrelated words"
    )]
    Foreseeable,
}

/// Says whether a new password is acceptable for somebody; `names` are the login, the person's, the site's and the
/// firm's names.
///
/// # Errors
/// The [`Weakness`], to be told to the person.
pub fn check_policy(password: &str, names: &[&str]) -> Result<(), Weakness> {
    let password = normalised(password);
    let length = password.chars().count();
    if length < SHORTEST {
        return Err(Weakness::TooShort(length));
    }
    if password.len() > LONGEST_BYTES {
        return Err(Weakness::TooLong(password.len()));
    }
    if unforeseen(&password, names) < FEWEST_UNFORESEEN {
        return Err(Weakness::Foreseeable);
    }
    Ok(())
}

/// How many code points are left after taking away names, known words, repetitions and steps of at most one.
fn unforeseen(password: &str, names: &[&str]) -> usize {
    let mut text = Zeroizing::new(password.to_lowercase());
    let names = names.iter().flat_map(|name| name.split_whitespace()).map(str::to_lowercase);
    for name in names.filter(|name| name.chars().count() >= 3) {
        *text = text.replace(&name, "\0");
    }
    for word in FORESEEABLE {
        *text = text.replace(word, "\0");
    }
    let letters: Zeroizing<Vec<char>> = Zeroizing::new(text.chars().collect());
    let mut count = 0;
    let mut before = '\0';
    for &letter in unit(&letters) {
        let step = u32::from(letter).abs_diff(u32::from(before));
        if letter != '\0' && (before == '\0' || step > 1) {
            count += 1;
        }
        before = letter;
    }
    count
}

/// The shortest beginning that, repeated, gives the whole text (the last repetition may be cut).
fn unit(letters: &[char]) -> &[char] {
    let repeats = |length: &usize| {
        letters.iter().skip(*length).eq(letters.iter().take(letters.len() - length))
    };
    let length = (1..letters.len()).find(repeats).unwrap_or(letters.len());
    &letters[..length]
}

#[cfg(test)]
mod tests {
    use super::*;

    const GOOD: &str = "quiet lantern over seven hills";

    #[test]
    fn fourteen_characters_are_too_few_and_fifteen_enough_whatever_they_are() {
        assert_eq!(check_policy("kz7#mw2!vq9%tr", &[]), Err(Weakness::TooShort(14)));
        assert_eq!(check_policy("kz7#mw2!vq9%trb", &[]), Ok(()));
        assert_eq!(check_policy("only small letters here", &[]), Ok(()));
        let emoji: String = "🍇🐝🧪🛢".chars().cycle().take(60).chain("🌲🦊🪵🧂".chars()).collect();
        assert_eq!(emoji.chars().count(), 64);
        assert_eq!(check_policy(&emoji, &[]), Ok(()));
        let varied: String =
            (0_u32..400).map(|i| char::from(33 + u8::try_from(i * 37 % 90).unwrap())).collect();
        assert_eq!(check_policy(&varied[..64], &[]), Ok(()));
        assert_eq!(check_policy(&varied[..128], &[]), Ok(()));
        assert_eq!(check_policy(&varied.repeat(3), &[]), Err(Weakness::TooLong(1200)));
    }

    #[test]
    fn foreseeable_passwords_are_refused_with_the_reason() {
        for password in [
            "aaaaaaaaaaaaaaaaaaaa",
            "password12345678",
            "Password12345678!",
            "passwordpassword",
            "123456789012345678",
            "qwertyuiopasdfghjkl",
            "abcdefghijklmnopqrstuvwxyz",
            "TallyStaveTallyStave",
            "abc1abc1abc1abc1",
            "annaberg annaberg annaberg",
            "HillsideWinery2026",
            "zyxwvutsrqponmlkj",
            "1q2w3e4r1q2w3e4r",
        ] {
            let refused = check_policy(password, &["annaberg", "Hillside Winery"]);
            assert_eq!(refused, Err(Weakness::Foreseeable), "{password}");
        }
        assert!(Weakness::Foreseeable.to_string().contains("tried first"));
        assert_eq!(check_policy(GOOD, &["annaberg", "Hillside Winery"]), Ok(()));
    }
}
