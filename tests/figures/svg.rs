//! As much of an SVG reader as the figures need: elements in order, well nested, and their texts.

use super::metrics::width;

/// The only elements a figure may hold.
pub const PLAIN: [&str; 10] =
    ["svg", "title", "g", "text", "rect", "line", "polyline", "polygon", "circle", "path"];

pub struct Text {
    pub content: String,
    pub x: f64,
    pub y: f64,
    pub size: f64,
    anchor: String,
    semibold: bool,
}

impl Text {
    /// Left, top, right and bottom, from capitals to baseline.
    pub fn bounds(&self) -> [f64; 4] {
        let width = width(&self.content, self.size, self.semibold);
        let left = match self.anchor.as_str() {
            "start" => self.x,
            "middle" => self.x - width / 2.0,
            "end" => self.x - width,
            other => panic!("unknown anchor {other}"),
        };
        [left, self.y - 0.66 * self.size, left + width, self.y]
    }
}

pub struct Picture {
    pub width: f64,
    pub height: f64,
    pub elements: Vec<String>,
    /// Opening tags with their attributes.
    pub tags: Vec<String>,
    pub texts: Vec<Text>,
}

impl Picture {
    /// Reads the picture; panics where it is not well formed.
    pub fn read(svg: &str) -> Self {
        let mut picture = Self {
            width: 0.0,
            height: 0.0,
            elements: Vec::new(),
            tags: Vec::new(),
            texts: Vec::new(),
        };
        let mut open: Vec<String> = Vec::new();
        let mut rest = svg;
        while let Some(start) = rest.find('<') {
            let (before, tag) = rest.split_at(start);
            assert!(!before.contains('>'), "stray > before {tag:.40}");
            let end = tag.find('>').unwrap_or_else(|| panic!("unclosed tag {tag:.40}"));
            let (inside, after) = (&tag[1..end], &tag[end + 1..]);
            if let Some(name) = inside.strip_prefix('/') {
                assert_eq!(open.pop().as_deref(), Some(name), "wrong nesting");
                if name == "text" {
                    let last = picture.texts.last_mut().unwrap_or_else(|| panic!("no text"));
                    last.content = plain(before);
                }
            } else {
                picture.element(inside.trim_end_matches('/'));
                if !inside.ends_with('/') {
                    open.push(inside.split(' ').next().unwrap_or_default().to_owned());
                }
            }
            rest = after;
        }
        assert!(open.is_empty(), "not closed: {open:?}");
        picture
    }

    fn element(&mut self, tag: &str) {
        let name = tag.split(' ').next().unwrap_or_default();
        let number = |key: &str| number(tag, key);
        match name {
            "svg" => (self.width, self.height) = (number("width"), number("height")),
            "text" => self.texts.push(Text {
                content: String::new(),
                x: number("x"),
                y: number("y"),
                size: number("font-size"),
                anchor: value(tag, "text-anchor").unwrap_or("start").to_owned(),
                semibold: value(tag, "font-weight").is_some(),
            }),
            _ => {}
        }
        self.elements.push(name.to_owned());
        self.tags.push(tag.to_owned());
    }

    /// All texts in one, lines of a label joined by spaces.
    pub fn words(&self) -> String {
        self.texts
            .iter()
            .map(|text| text.content.as_str())
            .collect::<Vec<_>>()
            .join(" ")
            .replace('\u{a0}', " ")
    }
}

fn value<'a>(tag: &'a str, key: &str) -> Option<&'a str> {
    let start = tag.find(&format!(" {key}=\"")).map(|at| at + key.len() + 3)?;
    tag[start..].split('"').next()
}

/// The value of an attribute that is a number.
pub fn number(tag: &str, key: &str) -> f64 {
    let text = value(tag, key).unwrap_or_else(|| panic!("{tag} has no {key}"));
    text.parse().unwrap_or_else(|_| panic!("{key} of {tag} is no number"))
}

fn plain(text: &str) -> String {
    text.replace("&lt;", "<").replace("&gt;", ">").replace("&quot;", "\"").replace("&amp;", "&")
}
