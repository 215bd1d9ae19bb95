//! Same input, same bytes.

use crate::support::{examples, folder, succeed, sufficit};

#[test]
fn folder_time_zone_locale_and_threads_leave_no_trace() {
    let outputs = ["r.pdf", "r.md", "r.txt", "r.json", "r.typ"];
    for spec in examples() {
        let runs = [("UTC", "C", "1"), ("Pacific/Auckland", "de_DE.UTF-8", "4")].map(
            |(zone, locale, threads)| {
                let place = folder();
                let copy = place.path().join("copied");
                std::fs::create_dir(&copy).expect("the folder can be made");
                for entry in std::fs::read_dir(spec.parent().expect("a folder")).expect("readable")
                {
                    let path = entry.expect("readable").path();
                    if path.is_file() {
                        std::fs::copy(&path, copy.join(path.file_name().expect("a name")))
                            .expect("copied");
                    }
                }
                let mut command = sufficit();
                command.arg("report").arg(copy.join(spec.file_name().expect("a name")));
                for output in outputs {
                    command.args(["-o", output]);
                }
                command.env("TZ", zone).env("LC_ALL", locale).env("LANG", locale);
                command.env("RAYON_NUM_THREADS", threads).current_dir(place.path());
                succeed(&mut command);
                let mut bytes = Vec::new();
                for output in outputs {
                    bytes.push(std::fs::read(place.path().join(output)).expect("readable"));
                }
                let mut figures: Vec<_> = std::fs::read_dir(place.path().join("r-figures"))
                    .expect("the folder exists")
                    .map(|e| e.expect("readable").path())
                    .collect();
                figures.sort();
                bytes.extend(figures.iter().map(|f| std::fs::read(f).expect("readable")));
                bytes
            },
        );
        let [first, second] = runs;
        assert_eq!(first.len(), second.len());
        for (position, (a, b)) in first.iter().zip(&second).enumerate() {
            assert!(a == b, "{}: output {position} differs", spec.display());
        }
    }
}
