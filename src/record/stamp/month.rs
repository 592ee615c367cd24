//! Names of months.

/// Number of a month by its name or the first letters of it, in English and German.
pub(super) fn month(word: &[u8]) -> Option<i64> {
    let mut low = [0_u8; 3];
    for (low, byte) in low.iter_mut().zip(word) {
        *low = byte.to_ascii_lowercase();
    }
    if word.len() > 10 {
        return None;
    }
    let rest = |full: &[&[u8]]| {
        word.len() == 3 || word.len() == 4 || full.iter().any(|name| name.eq_ignore_ascii_case(word))
    };
    let (number, full): (i64, &[&[u8]]) = match &low {
        b"jan" => (1, &[b"january", b"januar"]),
        b"feb" => (2, &[b"february", b"februar"]),
        b"mar" | [b'm', 0xc3, 0xa4 | 0xa3] | [b'm', 0xe4, b'r'] => {
            (3, &[b"march", "märz".as_bytes(), b"m\xe4rz"])
        }
        b"mrz" | b"mae" => (3, &[b"maerz"]),
        b"apr" => (4, &[b"april"]),
        b"may" | b"mai" => (5, &[]),
        b"jun" => (6, &[b"june", b"juni"]),
        b"jul" => (7, &[b"july", b"juli"]),
        b"aug" => (8, &[b"august"]),
        b"sep" => (9, &[b"september"]),
        b"oct" | b"okt" => (10, &[b"october", b"oktober"]),
        b"nov" => (11, &[b"november"]),
        b"dec" | b"dez" => (12, &[b"december", b"dezember"]),
        _ => return None,
    };
    rest(full).then_some(number)
}
