//! How often errors lie inside their bars: over meshes of exact shapes, at three demands each.
//!
//! `cargo bench --bench calibration` prints the table; `-- --rows` prints every number with the parts of its
//! bar, `-- --only TEXT` takes the meshes whose name holds the text.  A lone `--test` runs three meshes.
//!
//! Meshes are shared out alternately: constants of the bars are chosen on half A and judged on half B.

#![expect(clippy::print_stdout, clippy::print_stderr, reason = "a study prints its tables")]

mod cases;
mod kelvin;
#[path = "../../it/reference.rs"]
#[allow(dead_code, clippy::unwrap_used, reason = "shared with the tests, which use all of it")]
mod reference;
#[path = "../../it/shapes.rs"]
#[allow(dead_code, clippy::unwrap_used, reason = "shared with the tests, which use all of it")]
mod shapes;
#[path = "../../it/solving.rs"]
#[allow(dead_code, clippy::unwrap_used, reason = "shared with the tests, which use all of it")]
mod solving;

use amberskin::adapt;
use amberskin::adapt::Aim;
use amberskin::adapt::Demand;
use amberskin::adapt::Limits;
use amberskin::panel;
use amberskin::physics::capacitance::Matrix;
use amberskin::physics::field;
use amberskin::physics::field::Kind;
use amberskin::physics::solved::Bar;
use amberskin::physics::solved::KAPPA;
use amberskin::physics::solved::Solved;
use cases::Case;
use std::sync::Arc;
use std::time::Instant;

/// Demands on capacitances [1] with the most panels.
const DEMANDS: [(f64, usize); 3] = [(2e-2, 800), (5e-3, 1200), (1e-3, 1500)];

/// Panels at the start above which a mesh is left out, and named: it takes minutes.
const MOST_AT_START: usize = 2500;

/// Demand on maxima [1].
const MAX_FIELD: f64 = 0.02;

/// What is judged, with the coverage asked [1] and the most times that the median bar may be the median error.
const KINDS: [(&str, f64, f64); 4] =
    [("entry", 0.95, 3.0), ("earth", 0.95, 8.0), ("reduced", 0.95, 3.0), ("maximum", 0.90, 3.0)];

/// A number held against its exact value.
struct Held {
    kind: usize,
    name: String,
    /// Relative error [1].
    error: f64,
    /// Relative bar [1].
    bar: f64,
    /// Relative uncertainty of the exact value [1].
    uncertainty: f64,
    /// Parts of the bar over the exact value, by its constants [1].
    parts: String,
}

impl Held {
    fn covered(&self) -> bool {
        self.error.abs() <= self.bar + self.uncertainty
    }
}

/// Every known number of a mesh at every demand.
fn held(case: &Case) -> Vec<Held> {
    let assembly = solving::assembled(&case.bodies, &[], &case.images);
    let built = panel::build(Arc::new(assembly), &case.images);
    let mut panels = adapt::start(solving::FIRST_PANELS, None, built);
    if MOST_AT_START < panels.len() {
        println!("not run: {} starts with {} panels", case.name, panels.len());
        return Vec::new();
    }
    let potentials = |_: &Matrix| case.maxima.iter().map(|(v, _)| v.clone()).collect::<Vec<_>>();
    let mut found = Vec::new();
    for (capacitance, most) in DEMANDS {
        let aim = Aim { max_field: MAX_FIELD, potentials: &potentials };
        let field = (!case.maxima.is_empty()).then_some(aim);
        let limits = Limits { max_panels: Some(most), time: Some(6.0), memory: 4e9 };
        let finished = adapt::run(panels, 1.0, Demand { capacitance, field }, &limits, &|_| {});
        let finished = finished.unwrap_or_else(|e| panic!("{}: {e}", case.name));
        let solved = finished.solved;
        let name = format!("{}, asked {capacitance}, {} panels", case.name, solved.panels.len());
        capacitances(case, &solved, &name, &mut found);
        maxima(case, &solved, &name, &mut found);
        panels = solved.panels;
    }
    found
}

/// Entries, row sums and reduced values.
fn capacitances(case: &Case, solved: &Solved, name: &str, found: &mut Vec<Held>) {
    let n = case.matrix.len();
    let unit = |i: usize| (0..n).map(|k| if k == i { 1.0 } else { 0.0 }).collect::<Vec<f64>>();
    let mut wanted: Vec<(usize, String, Vec<f64>, Vec<f64>)> = Vec::new();
    for i in 0..n {
        wanted.extend((i..n).map(|j| (0, format!("C{}{}", i + 1, j + 1), unit(i), unit(j))));
        if 1 < n {
            wanted.push((1, format!("C{} to earth", i + 1), unit(i), vec![1.0; n]));
        }
        for j in i + 1..n {
            let half: Vec<f64> = unit(i).iter().zip(unit(j)).map(|(a, b)| 0.5 * (a - b)).collect();
            wanted.push((2, format!("{} against {}", i + 1, j + 1), half.clone(), half));
            // With body j floating without charge: stationary in its potential.
            let c = &solved.matrix;
            let float: Vec<f64> =
                unit(i).iter().zip(unit(j)).map(|(a, b)| a - b * c[i][j] / c[j][j]).collect();
            wanted.push((2, format!("{} with {} floating", i + 1, j + 1), float.clone(), float));
        }
    }
    for (kind, what, u, v) in wanted {
        let exact = |i: usize, j: usize| {
            let weight = u[i] * v[j];
            if weight == 0.0 { Some(0.0) } else { case.matrix[i][j].map(|c| weight * c) }
        };
        let terms: Option<Vec<f64>> = (0..n * n).map(|k| exact(k / n, k % n)).collect();
        let Some(terms) = terms else { continue };
        let exact: f64 = terms.iter().sum();
        let size: f64 = terms.iter().map(|t| t.abs()).sum();
        let (value, bar) = solving::combination(solved, &u, &v);
        found.push(Held {
            kind,
            name: format!("{name}: {what}"),
            error: value / exact - 1.0,
            bar: bar / exact.abs(),
            uncertainty: case.uncertainty * size / exact.abs(),
            parts: parts(solved, &u, &v, exact.abs()),
        });
    }
}

/// η, what of it is taken, the flat panels' rise on exact and on free forms, its second order at gaps, the drawn rise, the rest.
fn parts(solved: &Solved, u: &[f64], v: &[f64], exact: f64) -> String {
    let bar: Bar = solved.bar(u, v);
    let field =
        |w: &[f64], p: usize| -> f64 { w.iter().zip(&solved.charges.density).map(|(w, s)| w * s[p]).sum() };
    let (mut own_exact, mut own_free, mut second, mut told, mut bent) = (0.0, 0.0, 0.0, 0.0, 0.0);
    for p in 0..solved.panels.len() {
        let own = solved.panels.offset[p].abs();
        let term =
            (solved.permittivity_of_whole() * solved.panels.triangles[p].area() * field(u, p) * field(v, p))
                .abs();
        let eta = solved.estimate.eta(u, v, p);
        bent += (eta.mean + eta.variation).abs();
        second += own * (own / solved.gaps[p].max(f64::MIN_POSITIVE)).min(1.0) * term;
        if solved.panels.is_exact(p) {
            own_exact += own * term;
        } else {
            own_free += own * term;
            told += solved.panels.drawn[p].abs() * term;
        }
    }
    let rim = solved.permittivity_of_whole() * solved.rims.change(u, v).1;
    [bent, bar.discretisation / KAPPA, own_exact, own_free, second, told, rim, bar.solver]
        .map(|x| format!("{:.3e}", x / exact))
        .join(",")
}

fn maxima(case: &Case, solved: &Solved, name: &str, found: &mut Vec<Held>) {
    let survey = field::survey_smooth(&solved.panels);
    for (v, wanted) in &case.maxima {
        let peaks = field::solid_peaks(&survey, solved, v);
        for (body, exact) in wanted {
            let what = format!("{name}: maximum of {} at {v:?}", body + 1);
            let Some(peak) = peaks.iter().find(|p| p.body == *body && p.kind == Kind::Smooth) else {
                println!("{what}: not told");
                continue;
            };
            found.push(Held {
                kind: 3,
                name: what,
                error: peak.field / exact - 1.0,
                bar: peak.bar / exact,
                uncertainty: case.uncertainty,
                parts: [peak.local, peak.charges, peak.facets]
                    .map(|x| format!("{:.3e}", x / exact))
                    .join(","),
            });
        }
    }
}

fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    values.get(values.len() / 2).copied().unwrap_or(f64::NAN)
}

/// The table of a half, and whether it is as good as asked.
fn judge(half: &str, found: &[&Held]) -> bool {
    let mut good = true;
    for (kind, (word, least, most)) in KINDS.iter().enumerate() {
        let of: Vec<&&Held> = found.iter().filter(|held| held.kind == kind).collect();
        let covered = of.iter().filter(|held| held.covered()).count() as f64 / of.len().max(1) as f64;
        let bar = median(of.iter().map(|held| held.bar).collect());
        let error = median(of.iter().map(|held| held.error.abs()).collect());
        let ratio = bar / error;
        let word_of = |good: bool| if good { "as asked" } else { "MISSED" };
        println!(
            "half {half}: {word:8} {:5}, covered {:6.2} % ({}), median bar {bar:.2e}, median error {error:.2e}, \
             ratio {ratio:.2} ({})",
            of.len(),
            100.0 * covered,
            word_of(*least <= covered),
            word_of(ratio <= *most),
        );
        good &= *least <= covered && ratio <= *most;
    }
    for held in found.iter().filter(|held| !held.covered()) {
        println!("  outside: {}: error {:+.2e}, bar {:.2e}", held.name, held.error, held.bar);
    }
    good
}

fn main() {
    let args: Vec<String> = std::env::args().collect();
    let test = args.iter().any(|arg| arg == "--test");
    let rows = args.iter().any(|arg| arg == "--rows");
    let only = args.iter().position(|arg| arg == "--only").and_then(|k| args.get(k + 1));
    let apart = kelvin::agreement();
    assert!(apart < 1e-6, "two ways to solve two balls differ by {apart:.1e}");
    let all = cases::all();
    let clock = Instant::now();
    let mut halves: [Vec<Held>; 2] = Default::default();
    let mut count = [0, 0];
    for (k, case) in all.iter().enumerate() {
        let wanted = only.is_none_or(|text| case.name.contains(text.as_str()));
        if !wanted || (test && ![0, 40, 60].contains(&k)) {
            continue;
        }
        let began = clock.elapsed().as_secs_f64();
        let found = held(case);
        eprintln!("{k} {}: {:.1} s", case.name, clock.elapsed().as_secs_f64() - began);
        if rows {
            for h in &found {
                println!(
                    "row|{}|{}|{:.4e}|{:.4e}|{:.1e}|{}|{}",
                    k % 2,
                    KINDS[h.kind].0,
                    h.error,
                    h.bar,
                    h.uncertainty,
                    h.name,
                    h.parts
                );
            }
        }
        count[k % 2] += 1;
        halves[k % 2].extend(found);
    }
    for (half, (found, count)) in ["A", "B"].iter().zip(halves.iter().zip(count)) {
        println!("half {half}: {count} meshes");
        judge(half, &found.iter().collect::<Vec<_>>());
    }
    eprintln!("{:.0} s", clock.elapsed().as_secs_f64());
}
