//! Figures from ordinary and extreme data, measured with the font itself.

use sufficit::render::figures::{FigureError, power_curve, size_contour};
use sufficit::report::figures::{
    Assumed, Axis, Curve, Level, Mark, PowerCurve, Rule, SizeContour, SpreadLimits, round_sizes,
};

#[path = "figures/metrics.rs"]
mod metrics;
#[path = "figures/struck.rs"]
mod struck;
#[path = "figures/svg.rs"]
mod svg;

use struck::struck;
use svg::Picture;

const LONG: &str = "freshly isolated hippocampal organotypic slice cultures from heterozygous littermates \
                    kept at reduced oxygen tension daily";

fn number(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    let (whole, rest) =
        text.split_once('.').map_or((text.as_str(), String::new()), |(a, b)| (a, format!(".{b}")));
    let mut out = String::new();
    for (index, digit) in whole.chars().enumerate() {
        if index > 0 && digit != '-' && whole.len() > 4 && (whole.len() - index).is_multiple_of(3) {
            out.push('\u{202f}');
        }
        out.push(if digit == '-' { '\u{2212}' } else { digit });
    }
    out + &rest
}

/// Power of a two-sided z test at 5 %, enough for a picture.
fn power(n: f64, difference: f64, spread: f64) -> f64 {
    let shift = difference / (spread * (2.0 / n).sqrt());
    let tail = |x: f64| 0.5 * libm::erfc(x / std::f64::consts::SQRT_2);
    tail(1.96 - shift) + tail(1.96 + shift)
}

struct Plan {
    last: f64,
    difference: f64,
    spreads: [f64; 3],
    chosen: f64,
    ceiling: Option<f64>,
    target: f64,
}

const PLAN: Plan = Plan {
    last: 26.0,
    difference: 0.9,
    spreads: [0.5, 0.69, 1.1],
    chosen: 11.0,
    ceiling: Some(8.0),
    target: 0.8,
};

fn curve_data(plan: &Plan) -> PowerCurve {
    let curve = |assumed, spread: f64, note: &str| {
        let n = |i: u32| 2.0 + (plan.last - 2.0) * f64::from(i) / 60.0;
        let points = (0..=60).map(|i| (n(i), power(n(i), plan.difference, spread))).collect();
        Curve { assumed, label: format!("SD {spread:.2} mm²{note}"), points }
    };
    let reached = power(plan.chosen, plan.difference, plan.spreads[1]);
    PowerCurve {
        description: "Power rises with the number of axolotls.".to_owned(),
        x: Axis::counts("axolotls per group in the analysis", (0.0, plan.last), number),
        y: Axis::probability("power to detect a difference of 0.9 mm²", number),
        curves: vec![
            curve(Assumed::Low, plan.spreads[0], ""),
            curve(Assumed::Planned, plan.spreads[1], " (planned)"),
            curve(Assumed::High, plan.spreads[2], ""),
        ],
        target: Rule { at: plan.target, label: format!("target {:.0} %", plan.target * 100.0) },
        chosen: Mark {
            x: plan.chosen,
            y: reached,
            label: format!("{}: power {reached:.3}", number(plan.chosen, 0)),
        },
        ceiling: plan.ceiling.map(|at| Rule { at, label: format!("ceiling: {}", number(at, 0)) }),
    }
}

fn contour_data(
    sizes: &[f64],
    ceiling: Option<f64>,
    plan: (f64, f64),
    spans: [(f64, f64); 2],
) -> SizeContour {
    let [x, y] = spans;
    let mut sizes: Vec<f64> = sizes.to_vec();
    sizes.extend(ceiling.filter(|size| !sizes.contains(size)));
    sizes.sort_by(f64::total_cmp);
    let sign = if plan.0 < 0.0 { -1.0 } else { 1.0 };
    let level = |size: f64| Level {
        size,
        label: if ceiling == Some(size) {
            format!("ceiling: {}", number(size, 0))
        } else {
            number(size, 0)
        },
        ceiling: ceiling == Some(size),
        points: (0..21)
            .map(|i| {
                let spread = y.0 + (y.1 - y.0) * f64::from(i) / 20.0;
                (sign * 2.8 * spread * (2.0 / size).sqrt(), spread)
            })
            .collect(),
    };
    SizeContour {
        description: "The number rises with the standard deviation.".to_owned(),
        title: "axolotls per group needed".to_owned(),
        x: Axis::real("difference to detect (mm²)", x, number),
        y: Axis::real("standard deviation (mm²)", y, number),
        levels: sizes.into_iter().map(level).collect(),
        plan: Mark { x: plan.0, y: plan.1, label: "plan: 11".to_owned() },
        limits: Some(SpreadLimits {
            low: 0.7 * plan.1,
            high: 1.6 * plan.1,
            label: "80 % confidence limits of the SD".to_owned(),
        }),
    }
}

const SIZES: [f64; 6] = [5.0, 7.0, 11.0, 17.0, 25.0, 37.0];
const SPANS: [(f64, f64); 2] = [(0.5, 1.3), (0.4, 1.25)];

/// Data of every kind that a plan may give, with a name each.
fn curves() -> Vec<(&'static str, PowerCurve)> {
    let mut all = vec![
        ("ordinary", curve_data(&PLAN)),
        ("no ceiling", curve_data(&Plan { ceiling: None, ..PLAN })),
        ("ceiling equal to the choice", curve_data(&Plan { ceiling: Some(11.0), ..PLAN })),
        ("ceiling above the choice", curve_data(&Plan { ceiling: Some(20.0), ..PLAN })),
        ("ceiling at the end", curve_data(&Plan { ceiling: Some(26.0), ..PLAN })),
        (
            "all near one",
            curve_data(&Plan {
                spreads: [0.1, 0.12, 0.14],
                chosen: 3.0,
                ceiling: Some(4.0),
                ..PLAN
            }),
        ),
        ("all low", curve_data(&Plan { spreads: [20.0, 25.0, 30.0], ..PLAN })),
        ("coincident", curve_data(&Plan { spreads: [0.69; 3], ..PLAN })),
        (
            "smallest",
            curve_data(&Plan {
                last: 6.0,
                spreads: [0.2, 0.25, 0.4],
                chosen: 2.0,
                ceiling: Some(2.0),
                ..PLAN
            }),
        ),
        (
            "strict target",
            curve_data(&Plan { target: 0.999, chosen: 25.0, ceiling: Some(24.0), ..PLAN }),
        ),
        ("lax target", curve_data(&Plan { target: 0.05, ..PLAN })),
        (
            "millions",
            curve_data(&Plan {
                last: 5_000_000.0,
                difference: 0.01,
                spreads: [2.0, 2.5, 3.0],
                chosen: 980_000.0,
                ceiling: Some(5_000_000.0),
                ..PLAN
            }),
        ),
    ];
    let mut long = curve_data(&PLAN);
    long.x.title = format!("{LONG} per group in the analysis");
    long.y.title = format!("power to detect a difference of 0.9 in {LONG}");
    long.curves.iter_mut().for_each(|curve| curve.label = format!("SD of {LONG}"));
    long.chosen.label = format!("11 {LONG}: power 0.816");
    long.target.label = format!("target for {LONG}");
    all.push(("long names", long));
    let mut single = curve_data(&PLAN);
    single.curves.retain(|curve| curve.assumed == Assumed::Planned);
    all.push(("one curve", single));
    all
}

fn contours() -> Vec<(&'static str, SizeContour)> {
    let plan = (0.9, 0.69);
    let millions = [200_000.0, 500_000.0, 980_000.0, 2_000_000.0, 5_000_000.0];
    let mut all = vec![
        ("ordinary", contour_data(&SIZES, Some(8.0), plan, SPANS)),
        ("no ceiling", contour_data(&SIZES, None, plan, SPANS)),
        ("ceiling is the plan", contour_data(&SIZES, Some(11.0), plan, SPANS)),
        ("downward", contour_data(&SIZES, Some(8.0), (-0.9, 0.69), [(-1.4, -0.5), (0.4, 1.25)])),
        (
            "millions",
            contour_data(&millions, Some(1_500_000.0), (0.01, 2.5), [(0.005, 0.02), (1.4, 4.0)]),
        ),
        (
            "tiny",
            contour_data(&SIZES, Some(8.0), (9e-7, 6.9e-7), [(5e-7, 1.3e-6), (4e-7, 1.25e-6)]),
        ),
        ("huge", contour_data(&SIZES, Some(8.0), (9e9, 6.9e9), [(5e9, 1.3e10), (4e9, 1.25e10)])),
        (
            "dense",
            contour_data(
                &[5., 6., 7., 8., 9., 10., 11., 12., 13., 14.],
                Some(8.0),
                plan,
                [(0.3, 1.5), SPANS[1]],
            ),
        ),
        (
            "smallest",
            contour_data(&[2.0, 3.0, 4.0, 5.0], None, (0.9, 0.2), [(0.4, 1.3), (0.1, 0.4)]),
        ),
        ("plan in a corner", contour_data(&SIZES, Some(8.0), (0.5, 0.4), SPANS)),
        ("plan in the other corner", contour_data(&SIZES, Some(8.0), (1.3, 1.25), SPANS)),
    ];
    let mut long = contour_data(&SIZES, None, plan, SPANS);
    long.title = format!("{LONG} per group needed");
    long.x.title = format!("difference in {LONG} (mm²)");
    long.y.title = format!("standard deviation of {LONG}");
    long.plan.label = format!("plan: 11 {LONG}");
    all.push(("long names", long));
    all
}

fn pictures() -> Vec<(String, String)> {
    let named = |kind: &str, name: &str, svg: Result<String, FigureError>| match svg {
        Ok(svg) => (format!("{kind}, {name}"), svg),
        Err(error) => panic!("{kind}, {name}: {error}"),
    };
    curves()
        .iter()
        .map(|(name, data)| named("power", name, power_curve(data)))
        .chain(contours().iter().map(|(name, data)| named("contour", name, size_contour(data))))
        .collect()
}

#[test]
fn every_text_is_inside_the_canvas_and_on_no_other() {
    for (name, svg) in pictures() {
        let picture = Picture::read(&svg);
        let boxes: Vec<_> = picture.texts.iter().map(|text| (text, text.bounds())).collect();
        assert!(boxes.len() > 8, "{name}");
        for (index, (text, rect)) in boxes.iter().enumerate() {
            let inside = rect[0] >= 0.0
                && rect[1] >= 0.0
                && rect[2] <= picture.width
                && rect[3] <= picture.height;
            assert!(inside, "{name}: {:?} is clipped: {rect:?}", text.content);
            for (other, taken) in boxes.iter().take(index) {
                let across = rect[2].min(taken[2]) - rect[0].max(taken[0]);
                let down = rect[3].min(taken[3]) - rect[1].max(taken[1]);
                assert!(
                    across <= 0.0 || down <= 0.0,
                    "{name}: {:?} on {:?}",
                    text.content,
                    other.content
                );
            }
        }
    }
}

#[test]
fn no_line_runs_through_a_text() {
    for (name, svg) in pictures() {
        let struck = struck(&Picture::read(&svg));
        assert!(struck.is_empty(), "{name}: {struck:?}");
    }
}

/// Labels of a choice and a ceiling that lie near each other or on one line keep their distance.
#[test]
fn near_ceilings_keep_labels_apart() {
    for chosen in 3..=24 {
        for distance in [-2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 2.0] {
            let chosen = f64::from(chosen);
            let spreads = [0.3, 0.3 + 0.02 * chosen, 0.5 + 0.03 * chosen];
            let plan = Plan { chosen, spreads, ceiling: Some(chosen + distance), ..PLAN };
            let svg = power_curve(&curve_data(&plan)).unwrap_or_default();
            let picture = Picture::read(&svg);
            assert!(struck(&picture).is_empty(), "{chosen} {distance}: {:?}", struck(&picture));
            let boxes: Vec<_> = picture.texts.iter().map(svg::Text::bounds).collect();
            for (index, rect) in boxes.iter().enumerate() {
                for other in boxes.iter().take(index) {
                    let across = rect[2].min(other[2]) - rect[0].max(other[0]);
                    let down = rect[3].min(other[3]) - rect[1].max(other[1]);
                    assert!(across <= -4.0 || down <= -4.0, "{chosen} {distance}");
                }
            }
        }
    }
}

/// Whatever is left out of a long label, its last words stay.
#[test]
fn long_curve_labels_keep_their_last_word() {
    let mut data = curve_data(&PLAN);
    data.curves[1].label = format!("SD 0.69 {LONG} (planned)");
    let shown = Picture::read(&power_curve(&data).unwrap_or_default()).words();
    assert!(shown.contains("SD 0.69 ") && shown.contains('…') && shown.contains("(planned)"));
}

/// A label moved by hand onto another must be noticed, or the test above would prove nothing.
#[test]
fn the_check_notices_an_overlap() {
    let svg = "<svg width=\"100\" height=\"50\"><text x=\"10\" y=\"20\" font-size=\"15\" text-anchor=\"start\">one</text>\n\
               <text x=\"12\" y=\"24\" font-size=\"15\" text-anchor=\"start\">two</text></svg>";
    let picture = Picture::read(svg);
    let [a, b] = [picture.texts[0].bounds(), picture.texts[1].bounds()];
    assert!(a[2].min(b[2]) > a[0].max(b[0]) && a[3].min(b[3]) > a[1].max(b[1]));
}

/// The middle of a straight curve must lie half way between the ticks at its ends.
#[test]
fn points_stand_where_the_axes_say() {
    let mut data = curve_data(&Plan { last: 10.0, ceiling: None, ..PLAN });
    data.curves.truncate(1);
    data.curves[0].points = vec![(0.0, 0.0), (10.0, 1.0)];
    data.chosen = Mark { x: 5.0, y: 0.5, label: "middle".to_owned() };
    let picture = Picture::read(&power_curve(&data).unwrap_or_default());
    let tick = |label: &str| {
        let found = picture.texts.iter().find(|text| text.content == label);
        found
            .map(|text| (text.x, text.y - 0.33 * text.size))
            .unwrap_or_else(|| panic!("no tick {label}"))
    };
    let across = (tick("0").0 + tick("10").0) / 2.0;
    let up = (tick("0.0").1 + tick("1.0").1) / 2.0;
    let circles: Vec<&String> =
        picture.tags.iter().filter(|tag| tag.starts_with("circle")).collect();
    assert_eq!(circles.len(), 2);
    for circle in circles {
        let centre = |key: &str| svg::number(circle, key) / 10.0;
        assert!((centre("cx") - across).abs() < 0.11, "{circle} {across}");
        assert!((centre("cy") - up).abs() < 0.11, "{circle} {up}");
    }
    let ends = format!("{:.0}", tick("10").0 * 10.0);
    let curve =
        picture.tags.iter().find(|tag| tag.starts_with("polyline") && tag.contains("#4F7B93"));
    let points = curve.and_then(|tag| tag.split("points=\"").nth(1)).unwrap_or_default();
    assert!(points.contains(&ends), "{points} should end at {ends}");
}

/// The ground darkens from the band of the smallest sizes to that of the largest.
#[test]
fn bands_darken_as_sizes_rise() {
    let data = contour_data(&SIZES, None, (0.9, 0.69), SPANS);
    let picture = Picture::read(&size_contour(&data).unwrap_or_default());
    let bands = picture.tags.iter().filter(|tag| tag.starts_with("polygon"));
    let reds: Vec<i64> = bands
        .filter_map(|tag| tag.split("fill=\"#").nth(1))
        .filter_map(|fill| i64::from_str_radix(fill.get(..2)?, 16).ok())
        .collect();
    assert_eq!(reds.len(), SIZES.len());
    assert!(reds.windows(2).all(|pair| pair[0] > pair[1]), "{reds:?}");
}

#[test]
fn every_label_that_fits_is_shown_whole() {
    let data = curve_data(&PLAN);
    let shown = Picture::read(&power_curve(&data).unwrap_or_default()).words();
    let labels = [&data.target.label, &data.chosen.label, &data.x.title, &data.y.title];
    for label in labels.into_iter().chain(data.curves.iter().map(|curve| &curve.label)) {
        assert!(shown.contains(label.as_str()), "{label} is missing in {shown}");
    }
    let mut data = contour_data(&SIZES, Some(8.0), (0.9, 0.69), SPANS);
    let ceilings = data.levels.iter_mut().filter(|level| level.ceiling);
    ceilings.for_each(|level| level.label = "ceiling: 10, 8 after losses".to_owned());
    let picture = Picture::read(&size_contour(&data).unwrap_or_default());
    for Level { label, ceiling, .. } in &data.levels {
        let whole = picture.texts.iter().any(|text| text.content == *label);
        let wrapped = *ceiling && picture.words().contains(label.as_str());
        assert!(whole || wrapped, "{label} is missing");
    }
}

#[test]
fn pictures_are_small_plain_and_the_same_every_time() {
    let again = pictures();
    for ((name, svg), (_, second)) in pictures().into_iter().zip(again) {
        assert_eq!(svg, second, "{name}");
        assert!(svg.len() < 60_000, "{name}: {} bytes", svg.len());
        for foreign in
            ["<script", "href", "url(", "<style", "<image", "<!", "NaN", "inf", "<foreign"]
        {
            assert!(!svg.contains(foreign), "{name}: {foreign}");
        }
        // Every second piece between quotation marks is the value of an attribute.
        for value in svg.split('"').skip(1).step_by(2) {
            for part in value.split(|c: char| !(c.is_ascii_digit() || c == '.')) {
                let decimals = part.split_once('.').map_or(0, |(_, decimals)| decimals.len());
                assert!(decimals <= 2, "{name}: {part} in {value:.60}");
            }
        }
        let picture = Picture::read(&svg);
        assert!(
            picture.elements.iter().all(|e| svg::PLAIN.contains(&e.as_str())),
            "{name}: {:?}",
            picture.elements
        );
    }
}

#[test]
fn hostile_text_stays_text() {
    let hostile = "</text><script>alert(1)</script>&amp; \"x\" ]]> \u{0}\u{1b}[31m é";
    let mut data = curve_data(&PLAN);
    data.description = hostile.to_owned();
    data.x.title = hostile.to_owned();
    data.chosen.label = hostile.to_owned();
    data.curves[0].label = hostile.to_owned();
    let svg = power_curve(&data).unwrap_or_default();
    assert!(svg.contains("&lt;script&gt;") && !svg.contains("<script"));
    assert!(!svg.contains(['\u{0}', '\u{1b}']));
    Picture::read(&svg);
}

#[test]
fn bad_curves_are_refused() {
    let refused = |change: &dyn Fn(&mut PowerCurve)| {
        let mut data = curve_data(&PLAN);
        change(&mut data);
        power_curve(&data).err()
    };
    assert_eq!(
        refused(&|data| data.curves.clear()),
        Some(FigureError::Count { what: "curves", given: 0, least: 1, most: 3 })
    );
    assert_eq!(
        refused(&|data| data.curves[0].points[3].1 = f64::NAN),
        Some(FigureError::NotFinite { what: "curve" })
    );
    assert_eq!(
        refused(&|data| data.curves[0].points.swap(3, 4)),
        Some(FigureError::NotRising { what: "curve" })
    );
    assert_eq!(
        refused(&|data| data.x.to = data.x.from),
        Some(FigureError::EmptyAxis { axis: "horizontal" })
    );
    assert_eq!(
        refused(&|data| data.y.to = f64::INFINITY),
        Some(FigureError::NotFinite { what: "end of an axis" })
    );
    assert_eq!(
        refused(&|data| data.chosen.x = 99.0),
        Some(FigureError::Outside { what: "chosen size" })
    );
    assert_eq!(
        refused(&|data| data.target.at = 1.2),
        Some(FigureError::Outside { what: "target power" })
    );
    let far = Rule { at: 1e9, label: "far".to_owned() };
    assert_eq!(
        refused(&|data| data.ceiling = Some(far.clone())),
        Some(FigureError::Outside { what: "ceiling" })
    );
}

#[test]
fn bad_contours_are_refused() {
    let refused = |change: &dyn Fn(&mut SizeContour)| {
        let mut data = contour_data(&SIZES, Some(8.0), (0.9, 0.69), SPANS);
        change(&mut data);
        size_contour(&data).err()
    };
    assert!(matches!(
        refused(&|data| data.levels.clear()),
        Some(FigureError::Count { given: 0, .. })
    ));
    assert_eq!(
        refused(&|data| data.levels.swap(0, 1)),
        Some(FigureError::NotRising { what: "lines of equal size" })
    );
    assert_eq!(refused(&|data| data.x.from = -0.5), Some(FigureError::CrossesZero));
    assert_eq!(refused(&|data| data.plan.y = 9.0), Some(FigureError::Outside { what: "plan" }));
    assert_eq!(
        refused(&|data| data.levels[2].points[5].0 = f64::INFINITY),
        Some(FigureError::NotFinite { what: "line of equal size" })
    );
}

#[test]
fn round_sizes_serve_as_levels() {
    let sizes = round_sizes(4, 60, 8);
    assert!(sizes.len() >= 4 && sizes.iter().all(|size| (4..=60).contains(size)), "{sizes:?}");
}
