//! Lines that run through texts, found in the picture itself.

use super::svg::{self, Picture, Text};

type Point = (f64, f64);

/// Everything drawn as a line, in the units of the canvas; shapes in groups have ten to one.
fn segments(tag: &str) -> Vec<(Point, Point)> {
    let pair = |text: &str| {
        let (x, y) = text.split_once(',').unwrap_or_else(|| panic!("{text} is no point"));
        let read = |text: &str| text.parse::<f64>().unwrap_or_else(|_| panic!("{text}"));
        (read(x) / 10.0, read(y) / 10.0)
    };
    if tag.starts_with("polyline") {
        let points = tag.split("points=\"").nth(1).and_then(|rest| rest.split('"').next());
        let points: Vec<Point> = points.unwrap_or_default().split_whitespace().map(pair).collect();
        points.iter().copied().zip(points.iter().skip(1).copied()).collect()
    } else if tag.starts_with("line ") {
        let at = |key: &str| svg::number(tag, key);
        vec![((at("x1"), at("y1")), (at("x2"), at("y2")))]
    } else if tag.starts_with("circle") {
        let at = |key: &str| svg::number(tag, key) / 10.0;
        let (x, y, r) = (at("cx"), at("cy"), at("r"));
        vec![((x - r, y), (x + r, y)), ((x, y - r), (x, y + r))]
    } else {
        Vec::new()
    }
}

/// Whether a segment enters a box, by steps far smaller than any letter.
fn enters(((x0, y0), (x1, y1)): (Point, Point), [left, top, right, bottom]: [f64; 4]) -> bool {
    let length = (x1 - x0).hypot(y1 - y0);
    let steps = (length / 0.2).ceil().max(1.0) as u32;
    (0..=steps).any(|step| {
        let part = f64::from(step) / f64::from(steps);
        let (x, y) = (x0 + part * (x1 - x0), y0 + part * (y1 - y0));
        x > left && x < right && y > top && y < bottom
    })
}

/// The texts that a line or a mark runs through and no plate of paper keeps it from.
pub fn struck(picture: &Picture) -> Vec<String> {
    let (mut found, mut lines, mut plates) = (Vec::new(), Vec::new(), Vec::new());
    let mut texts = picture.texts.iter();
    for (at, tag) in picture.tags.iter().enumerate() {
        if tag.starts_with("text ") {
            found.extend(texts.next().map(|text| (at, text)));
        } else if tag.starts_with("rect") && tag.contains(" rx=") {
            let value = |key: &str| svg::number(tag, key);
            let (x, y) = (value("x"), value("y"));
            plates.push((at, [x, y, x + value("width"), y + value("height")]));
        } else {
            lines.extend(segments(tag).into_iter().map(|segment| (at, segment)));
        }
    }
    let kept_off = |line: usize, text: usize, [left, top, right, bottom]: [f64; 4]| {
        plates.iter().any(|(at, plate)| {
            *at > line
                && *at < text
                && plate[0] <= left
                && plate[1] <= top
                && plate[2] >= right
                && plate[3] >= bottom
        })
    };
    let through = |(at, text): &&(usize, &Text)| {
        let bounds = text.bounds();
        let met = |(line, segment): &(usize, (Point, Point))| {
            enters(*segment, bounds) && !kept_off(*line, *at, bounds)
        };
        lines.iter().any(met)
    };
    found.iter().filter(through).map(|(_, text)| text.content.clone()).collect()
}

/// A rule drawn through a label must be noticed, and one below a plate must not.
#[test]
fn the_check_notices_a_line_through_a_text() {
    let text = "<text x=\"10\" y=\"20\" font-size=\"15\" text-anchor=\"start\">one</text>\n";
    let line = "<g><polyline points=\"0,150 900,150\"/></g>\n";
    let plate = "<rect x=\"5\" y=\"5\" width=\"60\" height=\"20\" rx=\"3\"/>\n";
    let struck = |body: &str| {
        struck(&Picture::read(&format!("<svg width=\"100\" height=\"50\">{body}</svg>")))
    };
    assert_eq!(struck(&format!("{line}{text}")), ["one"]);
    assert_eq!(struck(&format!("{plate}{line}{text}")), ["one"]);
    assert_eq!(struck(&format!("{line}{text}{plate}")), ["one"]);
    assert!(struck(&format!("{line}{plate}{text}")).is_empty());
    assert!(struck(&format!("{}{text}", line.replace("150", "250"))).is_empty());
}
