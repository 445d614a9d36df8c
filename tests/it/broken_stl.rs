//! Broken and awkward STL files: none panics or takes long, each says what is wrong and where.
use crate::stl_bodies;
use crate::stl_bodies::Facets;
use amberskin::base::Vec3;
use amberskin::mesh::accept;
use amberskin::mesh::edges;
use amberskin::mesh::stl;
use std::time::Duration;
use std::time::Instant;

/// Longest time a file may take.
const LIMIT: Duration = Duration::from_secs(2);

/// What is to come of a file.
enum Expected {
    /// Facets of each solid, and codes of the findings.
    Read(&'static [usize], &'static [&'static str]),
    /// Words of the message besides the name of the file.
    Refused(&'static [&'static str]),
}
use Expected::{Read, Refused};

#[track_caller]
fn check(cases: Vec<(&str, Vec<u8>, Expected)>) {
    for (what, bytes, expected) in cases {
        let start = Instant::now();
        let result = stl::parse(&bytes, "part.stl");
        assert!(start.elapsed() < LIMIT, "{what}: {:?}", start.elapsed());
        match (result, expected) {
            (Ok(soup), Read(facets, codes)) => {
                let n: Vec<usize> = soup.solids.iter().map(|s| s.facets.len()).collect();
                assert_eq!(n, facets, "{what}");
                let found: Vec<&str> = soup.findings.iter().map(|f| f.code).collect();
                assert_eq!(found, codes, "{what}");
                assert!(soup.findings.iter().all(|f| f.text.starts_with("part.stl: ")), "{what}");
            }
            (Err(e), Refused(words)) => {
                let text = e.to_string();
                assert!(text.starts_with("part.stl: "), "{what}: {text}");
                assert!(text.len() < 300, "{what}: {text}");
                for word in words {
                    assert!(text.contains(word), "{what}: no `{word}` in: {text}");
                }
            }
            (Ok(soup), _) => panic!("{what}: read, with {:?}", soup.findings),
            (Err(e), _) => panic!("{what}: {e}"),
        }
    }
}

fn cube() -> Vec<u8> {
    stl_bodies::binary(&stl_bodies::cube())
}

/// The binary cube with bytes from `at` on replaced.
fn cube_with(at: usize, bytes: &[u8]) -> Vec<u8> {
    let mut cube = cube();
    cube[at..at + bytes.len()].copy_from_slice(bytes);
    cube
}

fn text() -> String {
    stl_bodies::ascii("part", &stl_bodies::cube())
}

/// The ASCII cube with the first `from` replaced.
#[track_caller]
fn text_with(from: &str, to: &str) -> Vec<u8> {
    assert!(text().contains(from), "{from}");
    text().replacen(from, to, 1).into_bytes()
}

#[test]
fn binary_files_are_held_against_their_length() {
    let behind = |n: usize| [cube(), vec![7; n]].concat();
    check(vec![
        ("no bytes", vec![], Refused(&["empty", "at least one facet"])),
        ("one byte", vec![0], Refused(&["byte 1", "84 bytes"])),
        ("60 bytes", vec![0; 60], Refused(&["byte 60", "84 bytes"])),
        ("end inside the head", cube()[..83].to_vec(), Refused(&["byte 83", "84 bytes"])),
        ("head only", vec![0; 84], Refused(&["no facets"])),
        ("count 0 of 12", cube_with(80, &[0]), Refused(&["byte 80", "says 0 facets", "room for 12"])),
        ("count 10 of 12", cube_with(80, &[10]), Refused(&["byte 80", "says 10 facets", "room for 12"])),
        ("count 13 of 12", cube_with(80, &[13]), Refused(&["byte 684", "12 whole facets of the 13"])),
        ("end inside a facet", cube()[..300].to_vec(), Refused(&["byte 300", "4 whole facets of the 12"])),
        ("end behind a facet", cube()[..284].to_vec(), Refused(&["byte 284", "4 whole facets of the 12"])),
        ("huge count", cube_with(80, &[255; 4])[..134].to_vec(), Refused(&["byte 134", "4294967295"])),
        ("big-endian count", cube_with(80, &[0, 0, 0, 12]), Refused(&["byte 80", "big-endian", "little"])),
        ("10 bytes behind", behind(10), Read(&[12], &["stl_trailing_bytes"])),
        ("123 bytes behind", behind(123), Read(&[12], &["stl_trailing_bytes"])),
        ("50 bytes behind", behind(50), Refused(&["says 12 facets", "room for 13"])),
        ("more behind than before", behind(9999), Refused(&["says 12 facets", "room for 211"])),
    ]);
}

#[test]
fn headers_do_not_decide() {
    let mut tens = stl_bodies::binary(&stl_bodies::cuboid([0.0; 3], [10.0; 3]));
    tens[..10].copy_from_slice(b"solid part");
    assert!(tens.iter().all(|&b| b < 0x80), "the case that a look at the bytes alone gets wrong");
    let long = b"solid facet normal outer loop vertex";
    check(vec![
        ("header `solid`, line feed", cube_with(0, b"solid part\n"), Read(&[12], &[])),
        ("header `solid`, zeros", tens, Read(&[12], &[])),
        ("header with all words", cube_with(0, long), Read(&[12], &[])),
        ("header `solid`, cut", cube_with(0, b"solid x")[..500].to_vec(), Refused(&["byte 500", "8 whole"])),
        ("header of a picture, yet STL", cube_with(0, b"\x89PNG\r\n\x1a\n"), Read(&[12], &[])),
        ("attributes used for colours", cube_with(132, &[0xff, 0x7f]), Read(&[12], &[])),
        ("stored normal not a number", cube_with(84, &f32::NAN.to_le_bytes()), Read(&[12], &[])),
        ("stored normal inwards", cube_with(92, &1f32.to_le_bytes()), Read(&[12], &["stl_stored_normals"])),
    ]);
}

#[test]
fn binary_coordinates_must_be_lengths() {
    let with = |at: usize, value: f32| cube_with(at, &value.to_le_bytes());
    check(vec![
        ("not a number", with(96, f32::NAN), Refused(&["byte 96", "NaN", "facet 1;", "finite"])),
        ("infinity", with(84 + 50 + 44, f32::INFINITY), Refused(&["byte 178", "inf", "facet 2;"])),
        ("minus infinity", with(100, f32::NEG_INFINITY), Refused(&["byte 100", "-inf"])),
        ("1e30", with(84 + 550 + 12, 1e30), Refused(&["byte 646", "1e30", "facet 12;", "1e15"])),
        ("-2e15", with(96, -2e15), Refused(&["byte 96", "-2e15", "1e15"])),
        ("subnormal", with(96, 1e-40), Read(&[12], &[])),
        ("big-endian throughout", big_endian(), Refused(&["big-endian"])),
    ]);
}

fn big_endian() -> Vec<u8> {
    let mut bytes = cube();
    bytes[80..84].reverse();
    for facet in bytes[84..].chunks_exact_mut(50) {
        facet[..48].chunks_exact_mut(4).for_each(<[u8]>::reverse);
    }
    bytes
}

#[test]
fn other_kinds_of_files_are_named() {
    let file = |start: &[u8]| [start, &[9, 1, 200, 0].repeat(100)].concat();
    let wide = |order: fn(u16) -> [u8; 2], mark: bool| -> Vec<u8> {
        let mark = if mark { "\u{feff}" } else { "" };
        format!("{mark}{}", text()).encode_utf16().flat_map(order).collect()
    };
    check(vec![
        ("PNG", file(b"\x89PNG\r\n\x1a\n"), Refused(&["byte 0", "PNG picture", "STL is wanted"])),
        ("JPEG", file(b"\xff\xd8\xff\xe0"), Refused(&["byte 0", "JPEG picture"])),
        ("GIF", file(b"GIF89a"), Refused(&["byte 0", "GIF picture"])),
        ("PDF", file(b"%PDF-1.7"), Refused(&["byte 0", "PDF document"])),
        ("ZIP", file(b"PK\x03\x04"), Refused(&["byte 0", "ZIP archive", "unpack"])),
        ("gzip", file(b"\x1f\x8b\x08"), Refused(&["byte 0", "gzip archive", "unpack"])),
        ("7z", file(b"7z\xbc\xaf\x27\x1c"), Refused(&["byte 0", "7z archive"])),
        ("STEP", file(b"ISO-10303-21;\n"), Refused(&["byte 0", "STEP model", "export"])),
        ("XML", file(b"<?xml version"), Refused(&["byte 0", "XML file"])),
        ("PLY", file(b"ply\nformat"), Refused(&["byte 0", "PLY mesh"])),
        ("UTF-16, little", wide(u16::to_le_bytes, true), Refused(&["byte 0", "UTF-16", "ASCII or UTF-8"])),
        ("UTF-16, big", wide(u16::to_be_bytes, true), Refused(&["byte 0", "UTF-16"])),
        ("UTF-16, no mark", wide(u16::to_le_bytes, false), Refused(&["byte 0", "UTF-16"])),
        ("a letter", b"Dear Sir,\nplease find".to_vec(), Refused(&["line 1", "`Dear Sir,`", "`solid`"])),
        ("Latin-1 text", b"Gr\xfc\xdfe".to_vec(), Refused(&["line 1", "`solid`"])),
        ("blanks", b" \n\n ".to_vec(), Refused(&["line 1", "`solid`"])),
        ("half a word", b"soli".to_vec(), Refused(&["line 1", "`soli`"])),
    ]);
}

#[test]
fn awkward_text_is_read() {
    let t = text();
    let two = format!("{t}{}", stl_bodies::ascii("other", &stl_bodies::ball(Vec3::zeros(), 1.0, 0)));
    let no_end = t.replace("endsolid part\n", "");
    let latin = [b"solid Stra\xdfe", &text().as_bytes()[10..]].concat();
    check(vec![
        ("two solids", two.clone().into_bytes(), Read(&[12, 8], &[])),
        ("UTF-8 mark", format!("\u{feff}{t}").into_bytes(), Read(&[12], &[])),
        ("leading blanks", format!("  \t{t}").into_bytes(), Read(&[12], &[])),
        ("leading blank line", format!("\n\n{t}").into_bytes(), Read(&[12], &[])),
        ("no name", t.replace(" part", "").into_bytes(), Read(&[12], &[])),
        ("upper case", t.to_uppercase().into_bytes(), Read(&[12], &[])),
        ("Latin-1 name", latin, Read(&[12], &[])),
        ("CRLF", t.replace('\n', "\r\n").into_bytes(), Read(&[12], &[])),
        ("CR only", t.replace('\n', "\r").into_bytes(), Read(&[12], &[])),
        ("tabs", t.replace("  ", "\t").into_bytes(), Read(&[12], &[])),
        ("name with words of STL", text_with("solid part", "solid facet normal vertex"), Read(&[12], &[])),
        ("no line feed at the end", t.trim_end().as_bytes().to_vec(), Read(&[12], &[])),
        (
            "a facet in one line",
            t.replace("\n ", " ").replacen(" facet", "\n facet", 1).into_bytes(),
            Read(&[12], &[]),
        ),
        ("no endsolid", no_end.clone().into_bytes(), Read(&[12], &["stl_no_endsolid"])),
        ("no endsolid between", format!("{no_end}{t}").into_bytes(), Read(&[12, 12], &["stl_no_endsolid"])),
        ("text behind", format!("{t}made by hand\n").into_bytes(), Read(&[12], &["stl_trailing_text"])),
        ("zeros behind", format!("{t}\0\0\0").into_bytes(), Read(&[12], &["stl_trailing_text"])),
        (
            "an empty solid first",
            format!("solid\nendsolid\n{t}").into_bytes(),
            Read(&[12], &["stl_empty_solid"]),
        ),
        ("normal not a number", text_with("normal 0 0 0", "normal nan -inf 0"), Read(&[12], &[])),
        (
            "stored normal inwards",
            text_with("normal 0 0 0", "normal 0 0 1"),
            Read(&[12], &["stl_stored_normals"]),
        ),
        ("plus signs and bare points", text_with("0e0 0e0 0e0", "+0. .0 -0"), Read(&[12], &[])),
    ]);
    let soup = stl::parse(two.as_bytes(), "part.stl").unwrap();
    assert_eq!(soup.solids.iter().map(|s| &*s.name).collect::<Vec<_>>(), ["part", "other"]);
}

#[test]
fn broken_text_is_refused_with_line_and_word() {
    let long = |n: usize| [b"solid ".to_vec(), vec![b'a'; n]].concat();
    let first = "vertex 0e0 0e0 0e0";
    check(vec![
        ("no facets", b"solid x\nendsolid x\n".to_vec(), Refused(&["no facets", "at least one"])),
        ("solid only", b"solid".to_vec(), Refused(&["no facets"])),
        (
            "decimal comma",
            text_with(first, "vertex 0,5 0 0"),
            Refused(&["line 4", "comma in `0,5`", "point"]),
        ),
        (
            "comma between",
            text_with(first, "vertex 0, 0, 0"),
            Refused(&["line 4", "comma in `0,`", "blanks"]),
        ),
        ("Fortran D", text_with(first, "vertex 1.5D-3 0 0"), Refused(&["line 4", "`1.5D-3`", "1.5E-3"])),
        ("not a number", text_with(first, "vertex 0 nan 0"), Refused(&["line 4", "`nan`", "finite"])),
        ("infinity", text_with(first, "vertex 0 -inf 0"), Refused(&["line 4", "`-inf`", "finite"])),
        (
            "over single precision",
            text_with(first, "vertex 0 1e39 0"),
            Refused(&["line 4", "`1e39`", "single"]),
        ),
        ("1e30", text_with(first, "vertex 0 1e30 0"), Refused(&["line 4", "`1e30`", "1e15"])),
        ("1.#QNAN", text_with(first, "vertex 0 1.#QNAN 0"), Refused(&["line 4", "`1.#QNAN`", "finite"])),
        ("a word", text_with(first, "vertex 0 zero 0"), Refused(&["line 4", "`zero` is not a number"])),
        ("hexadecimal", text_with(first, "vertex 0 0x10 0"), Refused(&["line 4", "`0x10` is not a number"])),
        ("long minus", text_with(first, "vertex 0 \u{2212}1 0"), Refused(&["line 4", "is not a number"])),
        ("zero byte", text_with(first, "vertex 0 1\0 0"), Refused(&["line 4", "is not a number"])),
        ("two numbers", text_with(first, "vertex 0 0"), Refused(&["line 4", "the line ends", "three"])),
        ("four numbers", text_with(first, "vertex 0 0 0 0"), Refused(&["line 4", "`0` where `vertex`"])),
        (
            "four corners",
            text_with("    endloop", "vertex 1 1 1\nendloop"),
            Refused(&["line 7", "three corners"]),
        ),
        ("two corners", text_with(first, ""), Refused(&["line 7", "`endloop` where `vertex`"])),
        (
            "no outer loop",
            text_with("    outer loop\n", ""),
            Refused(&["line 3", "`vertex` where `outer loop`"]),
        ),
        ("no endloop", text_with("    endloop\n", ""), Refused(&["line 7", "`endfacet` where `endloop`"])),
        ("no endfacet", text_with("  endfacet\n", ""), Refused(&["line 8", "`facet` where `endfacet`"])),
        ("no normal", text_with("facet normal 0 0 0", "facet"), Refused(&["line 2", "where `normal`"])),
        ("short normal", text_with("normal 0 0 0", "normal 0 0"), Refused(&["line 2", "three numbers"])),
        ("a stray word", text_with("  facet", "  face"), Refused(&["line 2", "`face` where `facet normal`"])),
        (
            "cut inside a facet",
            text().as_bytes()[..200].to_vec(),
            Refused(&["line 11", "the file ends where three"]),
        ),
        (
            "cut behind a corner",
            text().as_bytes()[..80].to_vec(),
            Refused(&["line 5", "the file ends where `vertex`"]),
        ),
        (
            "cut in `endsolid`",
            text().as_bytes()[..text().len() - 9].to_vec(),
            Refused(&["line 86", "the file ends"]),
        ),
        (
            "cut in a number",
            text_with(first, "vertex 0 0 1e")[..66].to_vec(),
            Refused(&["line 4", "the file ends"]),
        ),
        ("a long name", long(9000), Refused(&["line 1", "longer than 8192 bytes"])),
        ("50 MB in a line", long(50_000_000), Refused(&["line 1", "longer than 8192 bytes"])),
        (
            "a long word",
            text_with(first, &format!("vertex {} 0 0", "x".repeat(5000))),
            Refused(&["line 4", "…"]),
        ),
    ]);
}

/// Marsaglia's xorshift, J. Stat. Softw. 8 (2003) 14.
struct Random(u64);

impl Random {
    fn below(&mut self, n: usize) -> usize {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as usize % n.max(1)
    }
}

/// One to four flips, cuts, insertions or doubled ranges.
fn mutated(valid: &[u8], random: &mut Random) -> Vec<u8> {
    let mut bytes = valid.to_vec();
    for _ in 0..=random.below(4) {
        let at = random.below(bytes.len());
        let end = (at + 1 + random.below(120)).min(bytes.len());
        match random.below(8) {
            0 => bytes.truncate(at),
            1 => drop(bytes.drain(at..end)),
            2 => drop(bytes.splice(at..at, (0..end - at).map(|k| (k * 37) as u8))),
            3 => drop(bytes.splice(at..at, bytes[at..end].to_vec())),
            4 => bytes.get_mut(at).into_iter().for_each(|b| *b = b"0123456789-.e \n,dD"[end % 18]),
            _ => bytes.get_mut(at).into_iter().for_each(|b| *b ^= 1 << (end % 8)),
        }
    }
    bytes
}

/// One to ten facets copied, turned, taken out, bent to the corner of another or moved a little.
fn mangled(valid: &[[Vec3; 3]], random: &mut Random) -> Facets {
    let mut facets = valid.to_vec();
    for _ in 0..=random.below(10) {
        let (f, g, k) = (random.below(facets.len()), random.below(facets.len()), random.below(3));
        match random.below(6) {
            0 => facets.push(facets[f]),
            1 => facets[f].swap(0, 1),
            2 if 1 < facets.len() => drop(facets.remove(f)),
            3 => facets[f][k] = facets[g][(k + 1) % 3],
            4 => facets[f][k] = (facets[f][(k + 1) % 3] + facets[f][(k + 2) % 3]) * 0.5,
            _ => facets[f][k].x += 3e-7 * random.below(7) as f64,
        }
    }
    facets
}

/// Repairs and accepts; an accepted solid is closed, runs consistently and holds a volume.
fn inspect(facets: &[[Vec3; 3]], sheet: bool) -> bool {
    let Ok((surface, _)) = accept::body(facets, sheet, "part") else { return false };
    assert_eq!(surface.normals.len(), surface.welded.facets.len(), "normals of each facet");
    if !sheet {
        let sides = edges::sides(&surface.welded.facets);
        for edge in edges::by_edge(&sides) {
            assert_eq!(edge.len(), 2, "every edge has two facets");
            assert_ne!(edge[0].forward, edge[1].forward, "they run against each other");
        }
        let points = &surface.welded.points;
        let facets: Facets = surface.welded.facets.iter().map(|f| f.map(|p| points[p as usize])).collect();
        assert!(0.0 < stl_bodies::volume(&facets), "normals point outward");
    }
    true
}

/// Peak memory of this process [bytes], where the kernel tells it.
fn peak_memory() -> Option<usize> {
    let status = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:"))?;
    Some(line.trim().strip_suffix(" kB")?.parse::<usize>().ok()? * 1024)
}

#[test]
fn many_shells_and_many_loops_do_not_multiply() {
    let corner = |n: usize| Vec3::new((n % 30) as f64, (n / 30 % 30) as f64, (n / 900) as f64);
    let tetrahedron = |n: usize| {
        let o = corner(n);
        let [x, y, z] = [Vec3::x(), Vec3::y(), Vec3::z()].map(|e| o + e * 0.5);
        [[o, y, x], [o, z, y], [o, x, z], [x, y, z]]
    };
    let heap: Facets = (0..20_000).flat_map(tetrahedron).collect();
    let fan: Facets = (0..20_000)
        .map(|n| {
            let at = |s: f64| Vec3::new((n as f64 + s).cos(), (n as f64 + s).sin(), n as f64 * 1e-4);
            [Vec3::zeros(), at(0.0), at(1e-3)]
        })
        .collect();
    for (facets, is_accepted) in [(heap, true), (fan, false)] {
        let start = Instant::now();
        let result = accept::body(&facets, false, "heap");
        assert!(start.elapsed() < LIMIT, "{:?}", start.elapsed());
        assert_eq!(result.is_ok(), is_accepted, "{:?}", result.err());
    }
}

/// Runs in a process of its own, so that its peak memory is its own.
#[test]
fn ten_thousand_mutations_neither_panic_nor_take_long_nor_much_memory() {
    const CHILD: &str = "AMBERSKIN_MUTATIONS";
    if std::env::var_os(CHILD).is_none() {
        let name = "broken_stl::ten_thousand_mutations_neither_panic_nor_take_long_nor_much_memory";
        let output = std::process::Command::new(std::env::current_exe().unwrap())
            .args(["--exact", name, "--nocapture"])
            .env(CHILD, "1")
            .output()
            .unwrap();
        let said =
            String::from_utf8_lossy(&output.stdout).into_owned() + &String::from_utf8_lossy(&output.stderr);
        assert!(output.status.success() && said.contains("1 passed"), "{said}");
        return;
    }
    let ball = stl_bodies::ball(Vec3::new(0.3, 0.0, 0.0), 1.0, 1);
    let body: Facets = [stl_bodies::cube(), ball.clone()].concat();
    let (binary, text) = (stl_bodies::binary(&body), stl_bodies::ascii("part", &body).into_bytes());
    let mut random = Random(0x9e37_79b9_7f4a_7c15);
    let mut tally = [0; 4];
    for round in 0..10_000 {
        let start = Instant::now();
        let sheet = round % 5 == 0;
        let facets = match round % 4 {
            0 => mangled(&body, &mut random),
            kind => {
                let bytes = mutated(if kind == 1 { &text } else { &binary }, &mut random);
                match stl::parse(&bytes, "part.stl") {
                    Ok(soup) => soup.solids.into_iter().flat_map(|s| s.facets).collect(),
                    Err(e) => {
                        tally[0] += 1;
                        let said = e.to_string();
                        assert!(said.starts_with("part.stl: ") && said.len() < 400, "{said}");
                        Vec::new()
                    }
                }
            }
        };
        if !facets.is_empty() {
            tally[1] += 1;
            let accepted = inspect(&facets, sheet);
            tally[if accepted { 2 } else { 3 }] += 1;
        }
        assert!(start.elapsed() < LIMIT, "round {round}: {:?}", start.elapsed());
    }
    // The mutations must reach every stage, or they show nothing.
    assert!(tally.iter().all(|&n| 500 < n), "unread, read, accepted, refused: {tally:?}");
    if let Some(peak) = peak_memory() {
        assert!(peak < 200_000_000, "peak memory {peak} bytes");
    }
}
