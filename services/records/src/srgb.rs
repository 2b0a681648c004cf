//! A small sRGB profile, so that the colours of a record mean the same in twenty years.
//!
//! ICC.1:2010 (version 4.3): matrix and parametric curve. Primaries and curve of IEC 61966-2-1,
//! adapted from D65 to the profile space's D50 by the linear Bradford method. Values are in
//! millionths; the file holds them as signed 16.16 fixed-point numbers.

/// The D50 white of the profile connection space (ICC.1:2010, 7.2.16).
const WHITE: [i64; 3] = [964_200, 1_000_000, 824_900];
const RED: [i64; 3] = [436_065, 222_488, 13_916];
const GREEN: [i64; 3] = [385_147, 716_873, 97_076];
const BLUE: [i64; 3] = [143_066, 60_608, 714_096];
/// D65 to D50.
const ADAPTATION: [i64; 9] =
    [1_047_882, 22_919, -50_217, 29_587, 990_479, -17_059, -9_231, 15_076, 751_678];
/// `((x + 0.055) / 1.055)^2.4` above 0.04045, else `x / 12.92`: g, a, b, c, d of curve type 3.
const CURVE: [i64; 5] = [2_400_000, 947_867, 52_133, 77_399, 40_450];

/// The profile as a file.
pub(crate) fn profile() -> Vec<u8> {
    let tags = [
        (*b"desc", text("sRGB IEC61966-2.1")),
        (*b"cprt", text("No copyright, use freely")),
        (*b"wtpt", typed(*b"XYZ ", &WHITE)),
        (*b"chad", typed(*b"sf32", &ADAPTATION)),
        (*b"rXYZ", typed(*b"XYZ ", &RED)),
        (*b"gXYZ", typed(*b"XYZ ", &GREEN)),
        (*b"bXYZ", typed(*b"XYZ ", &BLUE)),
        (*b"rTRC", curve()),
        (*b"gTRC", curve()),
        (*b"bTRC", curve()),
    ];
    let start = 128 + 4 + 12 * tags.len();
    let (mut table, mut data) = (number(tags.len()).to_vec(), Vec::new());
    for (name, bytes) in tags {
        table.extend(name);
        table.extend(number(start + data.len()));
        table.extend(number(bytes.len()));
        data.extend(bytes);
        data.resize(data.len().next_multiple_of(4), 0);
    }
    let mut file = header(start + data.len());
    file.extend(table);
    file.extend(data);
    file
}

fn header(size: usize) -> Vec<u8> {
    let mut header = vec![0; 128];
    header[0..4].copy_from_slice(&number(size));
    header[8..10].copy_from_slice(&[4, 0x30]);
    header[12..24].copy_from_slice(b"mntrRGB XYZ ");
    // A fixed date, 2024-01-01: the profile is a constant.
    header[24..30].copy_from_slice(&[0x07, 0xe8, 0, 1, 0, 1]);
    header[36..40].copy_from_slice(b"acsp");
    for (index, value) in WHITE.into_iter().enumerate() {
        header[68 + 4 * index..72 + 4 * index].copy_from_slice(&fixed(value));
    }
    header
}

fn typed(kind: [u8; 4], values: &[i64]) -> Vec<u8> {
    let mut bytes = kind.to_vec();
    bytes.extend([0; 4]);
    bytes.extend(values.iter().flat_map(|&value| fixed(value)));
    bytes
}

fn curve() -> Vec<u8> {
    let mut bytes = b"para\0\0\0\0\0\x03\0\0".to_vec();
    bytes.extend(CURVE.iter().flat_map(|&value| fixed(value)));
    bytes
}

fn text(text: &str) -> Vec<u8> {
    let units: Vec<u8> = text.encode_utf16().flat_map(u16::to_be_bytes).collect();
    let mut bytes = b"mluc\0\0\0\0\0\0\0\x01\0\0\0\x0cenUS".to_vec();
    bytes.extend(number(units.len()));
    bytes.extend(number(28));
    bytes.extend(units);
    bytes
}

fn number(value: usize) -> [u8; 4] {
    u32::try_from(value).unwrap_or(u32::MAX).to_be_bytes()
}

/// Millionths as 16.16 fixed point, rounded half up.
fn fixed(millionths: i64) -> [u8; 4] {
    let scaled = (millionths * 65_536 + 500_000).div_euclid(1_000_000);
    i32::try_from(scaled).unwrap_or(i32::MAX).to_be_bytes()
}
