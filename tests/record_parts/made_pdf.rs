//! PDF files made by hand, sound and otherwise.

use std::io::Write;

/// An object's number and its text after `obj`.
pub type Made = (u32, Vec<u8>);

/// A file of these objects with a table; the trailer gets `extra`.
pub fn file(objects: &[Made], extra: &str) -> Vec<u8> {
    let mut out = b"%PDF-1.7\n".to_vec();
    let mut places = Vec::new();
    for (number, body) in objects {
        places.push((*number, out.len()));
        out.extend(format!("{number} 0 obj\n").bytes());
        out.extend(body);
        out.extend(b"\nendobj\n");
    }
    let start = out.len();
    out.extend(b"xref\n0 1\n0000000000 65535 f \n");
    for (number, place) in places {
        out.extend(format!("{number} 1\n{place:010} 00000 n \n").bytes());
    }
    let trailer = format!("trailer\n<</Size 99/Root 1 0 R{extra}>>\nstartxref\n{start}\n%%EOF\n");
    out.extend(trailer.bytes());
    out
}

pub fn text(number: u32, body: &str) -> Made {
    (number, body.as_bytes().to_vec())
}

pub fn stream(number: u32, entries: &str, content: &[u8]) -> Made {
    let mut body = format!("<</Length {}{entries}>>\nstream\n", content.len()).into_bytes();
    body.extend(content);
    body.extend(b"\nendstream");
    (number, body)
}

pub fn deflate(content: &[u8]) -> Vec<u8> {
    let mut packer = flate2::write::ZlibEncoder::new(Vec::new(), flate2::Compression::best());
    packer.write_all(content).expect("packed");
    packer.finish().expect("packed")
}

/// Zeros, packed: a thousandth of their size.
pub fn bomb(mebibytes: usize) -> Vec<u8> {
    let mut packer = flate2::write::ZlibEncoder::new(Vec::new(), flate2::Compression::best());
    let block = vec![0; 1 << 20];
    for _ in 0..mebibytes {
        packer.write_all(&block).expect("packed");
    }
    packer.finish().expect("packed")
}

pub fn specification(number: u32, name: &str, stream: u32) -> Made {
    text(number, &format!("<</Type/Filespec/F({name})/UF({name})/EF<</F {stream} 0 R>>>>"))
}

/// Catalogue, one specification and one stream: the smallest file with an
/// attachment.
pub fn small(entries: &str, content: &[u8]) -> Vec<u8> {
    file(&[catalogue("[(a) 2 0 R]"), specification(2, "a.txt", 3), stream(3, entries, content)], "")
}

pub fn catalogue(names: &str) -> Made {
    text(1, &format!("<</Type/Catalog/Names<</EmbeddedFiles<</Names{names}>>>>>>"))
}

/// The same as [`small`] in the compact form: objects 1 and 2 in an object stream
/// and the table in a stream with PNG prediction, as common tools write it.
pub fn compact(content: &[u8]) -> Vec<u8> {
    let first = "<</Names<</EmbeddedFiles<</Names[(a)2 0 R]>>>>>>";
    let second = "<</F(a.txt)/EF<</F 3 0 R>>>>";
    let head = format!("1 0 2 {} ", first.len() + 1);
    let objects = format!("{head}{first} {second}");
    let entries = format!("/Type/ObjStm/N 2/First {}/Filter/FlateDecode", head.len());
    let holder = stream(4, &entries, &deflate(objects.as_bytes()));
    let mut out = b"%PDF-1.7\n".to_vec();
    let mut places = Vec::new();
    for (number, body) in [stream(3, "", content), holder] {
        places.push(out.len() as u16);
        out.extend(format!("{number} 0 obj\n").bytes());
        out.extend(body);
        out.extend(b"\nendobj\n");
    }
    let start = out.len();
    let rows: [(u8, u16, u8); 6] = [
        (0, 0, 0),
        (2, 4, 0),
        (2, 4, 1),
        (1, places[0], 0),
        (1, places[1], 0),
        (1, start as u16, 0),
    ];
    let mut table = Vec::new();
    let mut above = [0_u8; 4];
    for (kind, second, third) in rows {
        let [high, low] = second.to_be_bytes();
        let row = [kind, high, low, third];
        table.push(2);
        table.extend(row.iter().zip(above).map(|(byte, up)| byte.wrapping_sub(up)));
        above = row;
    }
    let entries = "/Type/XRef/Size 6/Root 1 0 R/W[1 2 1]/Filter/FlateDecode\
                   /DecodeParms<</Predictor 12/Columns 4>>";
    let (number, body) = stream(5, entries, &deflate(&table));
    out.extend(format!("{number} 0 obj\n").bytes());
    out.extend(body);
    out.extend(format!("\nendobj\nstartxref\n{start}\n%%EOF\n").bytes());
    out
}
