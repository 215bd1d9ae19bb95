//! A small document of the kind that reports are made of.

use sufficit::render::pdf::{FontSet, Job, pdf};

pub const SPEC: &str = "sufficit: 1\ntitle: Limb regeneration\n# a comment\n";

pub const MAIN: &str = r##"#set document(
  title: "Limb regeneration — two temperatures",
  author: ("A. Example", "B. Example"),
  description: "A plan",
)
#set text(lang: "en", font: "Libertinus Serif")
#import "style.typ": note
= What is asked for
#note[24 axolotls, 12 in each group: α = 0.05, two-sided, Δ ≥ 0.9 mm².]
#math.equation(alt: "n is two sigma squared over delta squared", block: true, $ n = 2 sigma^2 / Delta^2 $)
#figure(image("figures/power.svg", alt: "Power against units", width: 80%), caption: [Power])
#table(columns: 2, table.header([group], [n]), [18 °C], [12], [22 °C], [12])
#let part(name, path, mime, relation) = pdf.attach(
  name,
  read(path, encoding: none),
  mime-type: mime,
  relationship: relation,
  description: "Part of the plan",
)
#part("study.yaml", "attachments/0", "application/yaml", "source")
#part("Größe und Maß.csv", "attachments/1", "text/csv", "data")
#part("empty.bin", "attachments/2", "application/octet-stream", "supplement")
"##;

pub const FIGURE: &str = r##"<svg width="760" height="420" viewBox="0 0 760 420" xmlns="http://www.w3.org/2000/svg"><rect width="760" height="420" fill="#ffffff"/><polyline fill="none" stroke="#1F5A7A" points="50,380 200,220 400,100 700,60"/><text x="300" y="400" font-family="Libertinus Serif, serif" font-size="15">Units in each group − n</text></svg>"##;

/// Bytes that no packing makes smaller, so that the attachment stands unpacked.
pub fn noise() -> Vec<u8> {
    let mut state = 1_u32;
    let step = |_| {
        state = state.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
        (state >> 24) as u8
    };
    (0..5000).map(step).collect()
}

pub fn job<'a>(main: &'a str, fonts: &'a FontSet) -> Job<'a> {
    let style = "#let note(body) = block(inset: 1em, stroke: 0.5pt, body)\n";
    Job {
        main,
        files: vec![
            ("style.typ".to_owned(), style.as_bytes().to_vec()),
            ("figures/power.svg".to_owned(), FIGURE.as_bytes().to_vec()),
            ("attachments/0".to_owned(), SPEC.repeat(20).into_bytes()),
            ("attachments/1".to_owned(), noise()),
            ("attachments/2".to_owned(), Vec::new()),
        ],
        date: (2031, 3, 14),
        fonts,
    }
}

pub fn sample_pdf() -> Vec<u8> {
    let fonts = FontSet::embedded();
    pdf(&job(MAIN, &fonts)).expect("the sample is in order")
}
