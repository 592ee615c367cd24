//! Invented data for the tests, and the pictures of them all, written where they can be looked at.

use super::*;

const MONDAY_2024: f64 = 1_704_067_200e6; // 1 January 2024, a Monday
const HOUR: f64 = 3600e6;

/// A small generator of even numbers in 0..1 (a linear congruence; the constants are those of Knuth's MMIX, from memory).
struct Dice(u64);

impl Dice {
    fn roll(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 33) as f64 / f64::from(1u32 << 31)
    }
}

/// Hourly net power of an invented island with wind and sun, kW.
pub(super) fn island() -> Vec<f64> {
    let mut dice = Dice(7);
    let (mut slow, mut fast) = (0.0, 0.0);
    (0..8784)
        .map(|h| {
            let day = f64::from(h) / 24.0;
            let hour = f64::from(h % 24);
            slow += -slow / 40.0 + 0.22 * (dice.roll() * 2.0 - 1.0);
            fast = 0.6 * fast + 0.5 * (dice.roll() * 2.0 - 1.0);
            let season = libm::cos((day - 15.0) / 58.25);
            let calm = 1.0 - 0.85 * libm::exp(-libm::pow((day - 46.5) / 5.0, 4.0));
            let wind = (60.0 + 18.0 * season + 62.0 * slow + 14.0 * fast).clamp(0.0, 172.0) * calm;
            let height = libm::sin(std::f64::consts::PI * (hour - 6.0) / 12.0).max(0.0);
            let sun = 60.0 * height * (0.7 - 0.3 * season);
            let demand = 48.0
                + 8.0 * season
                + if (6.0..16.0).contains(&hour) && libm::floor(day) % 7.0 < 6.0 { 24.0 } else { 0.0 };
            wind + sun - demand
        })
        .collect()
}

pub(super) fn sheet() -> (YearSheet, DurationCurve) {
    let net = island();
    let mut sorted = net.clone();
    sorted.sort_by(|a, b| b.total_cmp(a));
    let hours: Vec<f64> = (0..240).map(|i| 8784.0 * f64::from(i) / 239.0).collect();
    let curve = hours.iter().map(|h| sorted[(*h as usize).min(8783)]).collect();
    let sheet = YearSheet {
        start_us: MONDAY_2024,
        cell_s: 3600.0,
        cells_per_row: 168,
        critical_us: Some((MONDAY_2024 + 34.0 * 24.0 * HOUR, MONDAY_2024 + 51.5 * 24.0 * HOUR)),
        net_kw: net.clone(),
    };
    let curve = DurationCurve {
        hours,
        net_kw: curve,
        surplus_kwh: net.iter().filter(|p| **p > 0.0).sum(),
        deficit_kwh: net.iter().filter(|p| **p < 0.0).sum::<f64>().abs(),
        import_limit_kw: None,
        deficit_word: "deficit".to_owned(),
    };
    (sheet, curve)
}

pub(super) fn net() -> NetPower {
    let net = island();
    let (from, to) = (35 * 24, 56 * 24);
    let mut episodes = Vec::new();
    let mut start = 0;
    for group in net.chunk_by(|a, b| (*a > 0.0) == (*b > 0.0)) {
        let end = start + group.len();
        episodes.push(EpisodeMark {
            from_us: MONDAY_2024 + start as f64 * HOUR,
            to_us: MONDAY_2024 + end as f64 * HOUR,
            energy_kwh: group.iter().sum(),
        });
        start = end;
    }
    NetPower {
        t_us: (from..to).map(|h| MONDAY_2024 + (h as f64 + 0.5) * HOUR).collect(),
        least_kw: net[from..to].to_vec(),
        greatest_kw: net[from..to].to_vec(),
        episodes,
        strip_us: (0..366).map(|d| MONDAY_2024 + f64::from(d) * 24.0 * HOUR).collect(),
        strip_kw: net.chunks(24).map(|d| d.iter().sum::<f64>() / 24.0).collect(),
        window_us: (MONDAY_2024 + from as f64 * HOUR, MONDAY_2024 + to as f64 * HOUR),
        limits_kw: vec![],
    }
}

pub(super) fn coverage_curves() -> Coverage {
    let energy: Vec<f64> = (0..70).map(|i| 200.0 * f64::from(i)).collect();
    let curve = |power: f64, top: f64, scale: f64| CoverageCurve {
        power_kw: Some(power),
        value: energy
            .iter()
            .map(|e| (top * (1.0 - libm::exp(-e / scale)) + 0.25 * e / 14_000.0).min(top))
            .collect(),
        energy_kwh: energy.clone(),
    };
    Coverage {
        measure: Measure::ServedShare,
        curves: vec![curve(87.0, 1.0, 2200.0), curve(45.0, 0.94, 2300.0), curve(30.0, 0.79, 2100.0)],
        marks: [("knee", 3000.0, 0.8), ("asked", 4740.0, 0.96), ("no deficit", 12_000.0, 1.0)]
            .map(|(name, energy_kwh, value)| CoverageMark { name: name.to_owned(), energy_kwh, value })
            .to_vec(),
    }
}

pub(super) fn fall() -> Cumulative {
    let net = island();
    let mut sum = 20_000.0;
    let mut all = Vec::new();
    for p in &net {
        all.push(sum);
        sum += if *p > 0.0 { 0.94 * p } else { p / 0.94 };
    }
    let (from, to) = (22 * 24, 84 * 24);
    let (mut best, mut peak, mut c) = (0.0, from, (from, from));
    for i in from..to {
        if all[i] > all[peak] {
            peak = i;
        }
        if all[peak] - all[i] > best {
            best = all[peak] - all[i];
            c = (peak, i);
        }
    }
    let us = |i: usize| MONDAY_2024 + i as f64 * HOUR;
    Cumulative {
        t_us: (from..to).map(us).collect(),
        energy_kwh: all[from..to].to_vec(),
        critical: Some(Critical {
            from_us: us(c.0),
            to_us: us(c.1),
            from_kwh: all[c.0],
            to_kwh: all[c.1],
            delivered_kwh: best * 0.94,
        }),
    }
}

pub(super) fn deciding_week() -> Week {
    let net = island();
    let (from, to) = (50 * 24, 57 * 24);
    let (mut level, mut data) = (0.2, Week::default());
    for (h, &asked) in net.iter().enumerate().take(to).skip(from) {
        let room = if asked > 0.0 { (1.0 - level) * 2700.0 } else { level * 2700.0 };
        let carried = asked.signum() * asked.abs().min(42.0).min(room);
        data.t_us.push(MONDAY_2024 + h as f64 * HOUR);
        data.asked_kw.push(asked);
        data.carried_kw.push(carried);
        data.level.push(level);
        level = (level + carried / 2700.0).clamp(0.0, 1.0);
    }
    data.store = "2.7\u{202f}MWh delivered, 42\u{202f}kW".to_owned();
    data.unserved_word = "unserved".to_owned();
    data
}

/// One curve of a kind: most energy and power, and how far either spreads (a shape for tests, not a circuit).
fn bow(energy: f64, power: f64, hours: f64) -> Vec<(f64, f64)> {
    (0..50)
        .map(|k| {
            let p = power * libm::pow(energy / hours / power, f64::from(k) / 49.0);
            let used = 0.5 * (1.0 + libm::sqrt((1.0 - p / power).max(0.0)));
            (energy * used * p / (p + 2.0 * energy / hours / 3.0), p)
        })
        .collect()
}

pub(super) fn kinds() -> Plane {
    type Kind = (&'static str, f64, f64, f64, Option<u8>, bool);
    let list: [Kind; 10] = [
        ("Lithium iron phosphate", 78.0, 420.0, 600.0, Some(0), false),
        ("Sodium-ion", 66.0, 500.0, 600.0, Some(1), false),
        ("Vanadium flow", 7.5, 7.0, 700.0, Some(2), false),
        ("Hydrogen, tank", 240.0, 14.0, 900.0, Some(3), false),
        ("Lithium NMC", 92.0, 900.0, 600.0, None, false),
        ("Sodium-sulphur", 68.0, 40.0, 400.0, None, false),
        ("Lead-acid", 22.0, 160.0, 500.0, None, false),
        ("Flywheel, steel", 3.0, 700.0, 20.0, None, false),
        ("Double-layer capacitor", 2.6, 9000.0, 60.0, None, false),
        ("Pumped hydro", 0.8, 0.2, 80.0, None, true),
    ];
    let (power, energy) = (87.0, 4740.0);
    let hours = energy / power;
    let strands = list
        .into_iter()
        .enumerate()
        .map(|(i, (name, e, p, long, candidate, fluid_only))| {
            let typical = bow(e, p, long);
            let others = [1.5, 1.3, 1.12, 0.88, 0.72, 0.55]
                .into_iter()
                .map(|f| bow(e * f, p * libm::pow(f, -0.6), long))
                .collect();
            let meets = typical.windows(2).find_map(|w| {
                let (a, b) = (w[0].0 / w[0].1, w[1].0 / w[1].1);
                (a <= hours && b >= hours).then(|| {
                    let s = libm::log(hours / a) / libm::log(b / a);
                    let p = w[0].1 * libm::pow(w[1].1 / w[0].1, s);
                    (p * hours, p)
                })
            });
            Strand {
                technology: format!("kind-{i}"),
                name: name.to_owned(),
                fluid_only,
                typical,
                others,
                meets,
                verdict: Some([Verdict::Carries, Verdict::Strains, Verdict::Fails][i % 3]),
                candidate,
            }
        })
        .collect();
    Plane {
        basis: Basis::Mass,
        strands,
        requirement: Some((power, energy)),
        point: Some((59.25, 59.25 / hours)),
        budget: "80\u{202f}t".to_owned(),
    }
}

type Drawn = (&'static str, String);

/// Every picture of the invented site at a width.
pub(super) fn all(width: u32, palette: &Palette) -> Vec<Drawn> {
    let (sheet, curve) = sheet();
    let full = if width > 700 { width + 256 } else { width };
    let size = (full, year::height(full, year::rows(&sheet)));
    let year = svg(size, &year::sentence(&sheet, &curve), |s| year_sheet(s, size, palette, &sheet, &curve));
    let data = net();
    let size = (width, net::height(width));
    let net = svg(size, &net::sentence(&data), |s| net_power(s, size, palette, &data));
    let data = coverage_curves();
    let size = (width, coverage::height(width));
    let covered = svg(size, &coverage::sentence(&data), |s| coverage(s, size, palette, &data));
    let data = fall();
    let size = (width, cumulative::height(width));
    let fallen = svg(size, &cumulative::sentence(&data), |s| cumulative(s, size, palette, &data));
    let data = deciding_week();
    let size = (width, week::height(width));
    let carried = svg(size, &week::sentence(&data), |s| week(s, size, palette, &data));
    let data = kinds();
    let size = (full, plane::height(full));
    let ragone = svg(size, &plane::sentence(&data), |s| plane(s, size, palette, &data));
    // The same site on a grid connection of 40 kW, a short record, and plants that are built.
    let mut connected = curve;
    (connected.import_limit_kw, connected.deficit_word) = (Some(40.0), "import".to_owned());
    let short = YearSheet {
        net_kw: island()[..24 * 17].to_vec(),
        critical_us: Some((MONDAY_2024 + 200.0 * HOUR, MONDAY_2024 + 900.0 * HOUR)),
        ..sheet
    };
    let size = (full, year::height(full, year::rows(&short)));
    let short = svg(size, "", |s| year_sheet(s, size, palette, &short, &connected));
    let mut data = self::net();
    data.limits_kw = vec![-40.0, 60.0];
    let size = (width, net::height(width));
    let limited = svg(size, "", |s| net_power(s, size, palette, &data));
    let mut data = coverage_curves();
    data.measure = Measure::HeldImportKw;
    for curve in &mut data.curves {
        curve.value.iter_mut().for_each(|v| *v = 90.0 - 60.0 * *v);
    }
    data.marks = vec![CoverageMark { name: "asked".to_owned(), energy_kwh: 4740.0, value: 32.0 }];
    let size = (width, coverage::height(width));
    let held = svg(size, "", |s| coverage(s, size, palette, &data));
    // Every kind of a full catalogue at once.
    let mut data = kinds();
    for (factor, word) in [(0.7, "light"), (1.4, "heavy")] {
        for mut strand in kinds().strands {
            let moved = |c: &(f64, f64)| (c.0 * factor, c.1 * factor * factor);
            strand.typical = strand.typical.iter().map(moved).collect();
            strand.others = strand.others.iter().map(|o| o.iter().map(moved).collect()).collect();
            strand.technology = format!("{}-{word}", strand.technology);
            strand.name = format!("{}, {word}", strand.name);
            (strand.candidate, strand.meets) = (None, None);
            data.strands.push(strand);
        }
    }
    let size = (full, plane::height(full));
    let crowded = svg(size, "", |s| plane(s, size, palette, &data));
    let mut data = kinds();
    data.basis = Basis::Absolute;
    (data.point, data.budget) = (Some((4740.0, 87.0)), String::new());
    for strand in &mut data.strands {
        let long = |c: &(f64, f64)| (c.0 * 1e3, c.1 * 300.0);
        strand.typical = strand.typical.iter().map(long).collect();
        strand.others.clear();
        (strand.meets, strand.candidate) = (None, None);
    }
    let size = (full, plane::height(full));
    let built = svg(size, "", |s| plane(s, size, palette, &data));
    [
        ("year", year),
        ("year-short", short),
        ("net", net),
        ("net-limits", limited),
        ("coverage", covered),
        ("coverage-held", held),
        ("cumulative", fallen),
        ("week", carried),
        ("plane", ragone),
        ("plane-built", built),
        ("plane-all", crowded),
    ]
    .map(|(name, text)| (name, text.unwrap()))
    .to_vec()
}

#[test]
fn every_picture_is_drawn_at_every_width_and_in_every_scheme() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("target").join("pictures");
    std::fs::create_dir_all(&folder).unwrap();
    for (width, scheme) in [
        (742, Scheme::Light),
        (742, Scheme::Dark),
        (320, Scheme::Light),
        (320, Scheme::Dark),
        (742, Scheme::High),
        (742, Scheme::Print),
        (520, Scheme::Light),
    ] {
        for (name, text) in all(width, scheme.palette()) {
            for bad in ["NaN", "inf"] {
                assert!(!text.contains(bad), "{name} at {width} holds {bad}");
            }
            std::fs::write(folder.join(format!("{name}-{width}-{scheme:?}.svg").to_lowercase()), text)
                .unwrap();
        }
    }
}

/// Every text of a picture with the patch that it takes, haloes left out.
fn texts(picture: &str) -> Vec<(String, label::Patch)> {
    let value = |tag: &str, name: &str| -> Option<String> {
        Some(tag.split_once(&format!(" {name}=\""))?.1.split_once('"')?.0.to_owned())
    };
    picture
        .lines()
        .filter(|l| l.starts_with("<text") && !l.contains(" stroke="))
        .map(|line| {
            let (tag, rest) = line.split_once('>').unwrap();
            let text = rest.strip_suffix("</text>").unwrap().to_owned();
            let number = |name: &str| value(tag, name).unwrap().parse::<f64>().unwrap() / FINE;
            let (x, size) = (number("x"), number("font-size"));
            let base = number("y") + 0.76 * size;
            let width = metrics::width(&text, size, tag.contains("font-weight"));
            let x0 = match value(tag, "text-anchor").as_deref() {
                Some("end") => x - width,
                Some("middle") => x - width / 2.0,
                _ => x,
            };
            // Figures and most letters: from the height of capitals to just under the baseline.
            (text, label::Patch { x0, y0: base - 0.66 * size, x1: x0 + width, y1: base + 0.1 * size })
        })
        .collect()
}

#[test]
fn no_text_overlaps_another_or_leaves_the_picture_at_any_width() {
    for width in [300, 320, 344, 390, 430, 520, 560, 640, 712, 742, 1040] {
        for (name, picture) in all(width, &LIGHT) {
            let texts = texts(&picture);
            assert!(texts.len() > 6, "{name} at {width} has hardly a text");
            let size = |attribute: &str| -> f64 {
                picture
                    .split_once(&format!("{attribute}=\""))
                    .unwrap()
                    .1
                    .split_once('"')
                    .unwrap()
                    .0
                    .parse()
                    .unwrap()
            };
            let page = label::Patch { x0: -0.5, y0: 0.0, x1: size("width") + 0.5, y1: size("height") };
            for (i, (text, patch)) in texts.iter().enumerate() {
                assert!(patch.within(&page), "{name} at {width}: {text} leaves the picture, {patch:?}");
                for (other, taken) in &texts[i + 1..] {
                    assert!(!patch.overlaps(taken), "{name} at {width}: {text} overlaps {other}");
                }
            }
        }
    }
}
