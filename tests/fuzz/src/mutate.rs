//! Meter files of every shape, damaged at random in a plain loop: `mutate SECONDS SEED`.
//!
//! A file that makes the reader panic is written to `crash-SEED-N.bin` before it is read.

use std::fmt::Write as _;
use std::time::{Duration, Instant};

/// A small generator of random numbers (xorshift64*, Vigna 2016).
struct Random(u64);

impl Random {
    fn next(&mut self) -> u64 {
        self.0 ^= self.0 >> 12;
        self.0 ^= self.0 << 25;
        self.0 ^= self.0 >> 27;
        self.0.wrapping_mul(0x2545_f491_4f6c_dd1d)
    }

    fn below(&mut self, most: usize) -> usize {
        (self.next() >> 33) as usize % most.max(1)
    }
}

/// Whole files to begin with: one of each shape.
fn seeds() -> Vec<Vec<u8>> {
    let mut plain = "time,PV [kW],load [kW],price EUR/MWh,quality\n".to_owned();
    let mut german = "Site;mill\nDatum;Uhrzeit;Bezug kWh;Einspeisung kWh;Status\n".to_owned();
    let mut register = "Zeit;Zählerstand [kWh]\n".to_owned();
    let mut long = "timestamp,obis,value,unit\n".to_owned();
    let mut typical = "time,load kW\n".to_owned();
    let mut epoch = "ts,L1 W,L2 W,L3 W\n".to_owned();
    let mut parts = "Year,Month,Day,Hour,load kW\n".to_owned();
    for i in 0..60 {
        let (day, hour) = (1 + i / 24, i % 24);
        let _ = writeln!(plain, "2026-03-{:02} {hour:02}:00,{},{},{},A", 27 + day, i % 7, i % 5, 40 + i % 9);
        let _ = writeln!(german, "{:02}.10.26;{:02}:00;{},{};0,5;W", 23 + day, hour + 1, i % 11, i % 10);
        let _ = writeln!(register, "{day:02}.01.2026 {hour:02}:00;{}", (99_970 + i) % 100_000);
        let _ = writeln!(long, "2026-01-{day:02}T{hour:02}:00Z,1-0:1.8.0,{},kWh", 10 + i);
        let _ = writeln!(long, "2026-01-{day:02}T{hour:02}:00Z,1-0:2.8.0,{},kWh", 20 + i / 2);
        let _ = writeln!(typical, "{:02}-{day:02} {hour:02}:00,{}", 1 + i % 3, i % 4);
        let _ = writeln!(epoch, "{},{i},{},3", 1_769_817_600 + i * 60, i * 2);
        let _ = writeln!(parts, "2026,1,{day},{},{}", hour + 1, i % 6);
    }
    let mut days = "Meter,Date,Channel".to_owned();
    (0..48).for_each(|i| days += &format!(",{:02}:{:02}", i / 2, i % 2 * 30));
    for day in 1..20 {
        for channel in ["Import kWh", "Export kWh"] {
            let _ = write!(days, "\nA1,2026-01-{day:02},{channel}");
            (0..48).for_each(|i| days += &format!(",{}", (i * day) % 13));
        }
    }
    let counts: String = (1..=100).map(|i| format!(";{i}")).collect();
    let mut hundred = format!("Datum{counts}\n");
    for day in 24..29 {
        let _ = write!(hundred, "{day}.10.2025");
        (0..96).for_each(|i| hundred += &format!(";{},5", i % 9));
        hundred += ";;;;\n";
    }
    let two = format!("{plain}\u{1e}time,load kW\n2026-03-28 00:00,4\n2026-03-28 00:20,5\n2026-03-28 00:40,6\n");
    let laid = format!("{plain}\u{1e}{}", typical.replace("load", "PV"));
    [plain, german, register, long, typical, epoch, parts, days, hundred, two, laid]
        .into_iter()
        .map(String::into_bytes)
        .collect()
}

/// Pieces that tables are made of, to be put in anywhere.
const PIECES: [&str; 30] = [
    "\n", "\r\n", ",", ";", "\t", "\"", "\"\"", "1e999", "-1e308", "inf", "NaN", "9999-12-31 23:59", "0001-01-01 00:00",
    "24:00", "29.02.", "2026-03-29 02:30", "2025-10-26 02:15B", "+18:00", "-99", "0", "99999999999999999999", "1.234,5",
    "1'000", "\u{feff}", "Ä", "1-1:1.8.0", "kWh", "time", "00:15", "#",
];

fn damage(bytes: &mut Vec<u8>, others: &[Vec<u8>], random: &mut Random) {
    for _ in 0..=random.below(6) {
        let at = random.below(bytes.len() + 1);
        let end = (at + random.below(40)).min(bytes.len());
        match random.below(8) {
            0 if at < bytes.len() => bytes[at] = (random.next() >> 40) as u8,
            1 => {
                bytes.drain(at..end);
            }
            2 | 3 => {
                let piece = PIECES[random.below(PIECES.len())];
                bytes.splice(at..at, piece.bytes());
            }
            4 => {
                let copy = bytes[at..end].to_vec();
                bytes.splice(at..at, copy);
            }
            5 => bytes.truncate(at),
            6 => {
                // Whole rows change places.
                let mut rows: Vec<Vec<u8>> = bytes.split(|byte| *byte == b'\n').map(<[u8]>::to_vec).collect();
                let (one, other) = (random.below(rows.len()), random.below(rows.len()));
                rows.swap(one, other);
                *bytes = rows.join(&b'\n');
            }
            _ => {
                let other = &others[random.below(others.len())];
                let from = random.below(other.len());
                let to = (from + random.below(200)).min(other.len());
                bytes.splice(at..at, other[from..to].iter().copied());
            }
        }
    }
}

fn main() {
    let number = |at: usize, default: u64| {
        std::env::args().nth(at).and_then(|text| text.parse().ok()).unwrap_or(default)
    };
    let (seconds, seed) = (number(1, 60), number(2, 1));
    let mut random = Random(seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) | 1);
    let seeds = seeds();
    seeds.iter().for_each(|bytes| millpond_fuzz::check(bytes));
    let (start, mut count, mut slowest) = (Instant::now(), 0_u64, Duration::ZERO);
    while start.elapsed() < Duration::from_secs(seconds) {
        let mut bytes = seeds[random.below(seeds.len())].clone();
        damage(&mut bytes, &seeds, &mut random);
        let began = Instant::now();
        if std::panic::catch_unwind(|| millpond_fuzz::check(&bytes)).is_err() {
            let name = format!("crash-{seed}-{count}.bin");
            let written = std::fs::write(&name, &bytes);
            eprintln!("{name}: the reader panicked ({written:?})");
            std::process::exit(1);
        }
        slowest = slowest.max(began.elapsed());
        count += 1;
    }
    println!("{count} files read, the slowest in {} ms", slowest.as_millis());
}
