use super::tables::{Within, complaint, read, verify};
use proptest::prelude::*;
use std::f64::consts::PI;
use sufficit::numerics::multivariate::BivariateNormal;
use sufficit::numerics::{normal_cdf, normal_sf};

fn pair(rho: f64) -> BivariateNormal {
    BivariateNormal::new(rho).expect("a correlation")
}

#[test]
fn orthants_match_the_reference_table() {
    verify(&read("bivariate_normal"), |row| {
        let orthant = pair(row.number("rho")).upper_orthant(row.number("h"), row.number("k"));
        let orthant = orthant.expect("a probability");
        let expected = row.number("upper_orthant");
        vec![
            complaint(row, "orthant", orthant, expected, Within::Absolute(1e-14)),
            complaint(row, "orthant", orthant, expected, Within::Relative(1e-12)),
        ]
    });
}

#[test]
fn the_quarter_plane_has_its_closed_form() {
    // Sheppard (1899), Philosophical Transactions of the Royal Society A 192, 101-167.
    for i in -1000..=1000 {
        let rho = f64::from(i) / 1000.0;
        let exact = 0.25 + libm::asin(rho) / (2.0 * PI);
        let orthant = pair(rho).upper_orthant(0.0, 0.0).expect("a probability");
        assert!((orthant - exact).abs() < 1e-15, "{rho}: {orthant} against {exact}");
    }
}

#[test]
fn full_dependence_and_independence_are_exact() {
    for (h, k) in [(0.3, -1.0), (2.0, 2.0), (-3.0, 1.0), (9.0, 8.5)] {
        let both = pair(1.0).upper_orthant(h, k).expect("a probability");
        assert!((both / normal_sf(h.max(k)) - 1.0).abs() < 1e-13, "{both}");
        let opposed = pair(-1.0).upper_orthant(h, k).expect("a probability");
        let exact = (normal_sf(h) - normal_sf(-k)).max(0.0);
        assert!((opposed - exact).abs() < 1e-15, "{opposed}");
        let free = pair(0.0).cdf(h, k).expect("a probability");
        assert!((free / (normal_cdf(h) * normal_cdf(k)) - 1.0).abs() < 1e-13);
    }
    let infinite = f64::INFINITY;
    assert_eq!(pair(0.3).cdf(infinite, 1.0), Ok(normal_cdf(1.0)));
    assert_eq!(pair(0.3).upper_orthant(infinite, 1.0), Ok(0.0));
    assert!(BivariateNormal::new(1.1).is_err() && pair(0.3).cdf(f64::NAN, 0.0).is_err());
}

proptest! {
    #[test]
    fn rectangles_partition_the_plane(rho in -1f64..=1.0, x in -6f64..6.0, y in -6f64..6.0, w in 0f64..4.0, v in 0f64..4.0) {
        let unit = pair(rho);
        let infinite = f64::INFINITY;
        let columns = [(-infinite, x), (x, x + w), (x + w, infinite)];
        let rows = [(-infinite, y), (y, y + v), (y + v, infinite)];
        let mut total = 0.0;
        for column in columns {
            let mut strip = 0.0;
            for row in rows {
                let part = unit.rectangle(column, row).expect("a probability");
                prop_assert!((0.0..=1.0).contains(&part));
                strip += part;
            }
            let marginal = normal_cdf(column.1) - normal_cdf(column.0);
            prop_assert!((strip - marginal).abs() < 3e-14, "{strip} against {marginal}");
            total += strip;
        }
        prop_assert!((total - 1.0).abs() < 3e-14);
    }

    #[test]
    fn any_finite_arguments_give_probabilities(rho in -1f64..=1.0, h in prop::num::f64::NORMAL, k in prop::num::f64::NORMAL) {
        let orthant = pair(rho).upper_orthant(h, k).expect("a probability");
        prop_assert!((0.0..=1.0).contains(&orthant));
    }

    #[test]
    fn orthants_rise_with_the_correlation(rho in -0.99f64..0.99, h in -5f64..5.0, k in -5f64..5.0) {
        let less = pair(rho).upper_orthant(h, k).expect("a probability");
        let more = pair(rho + 0.01).upper_orthant(h, k).expect("a probability");
        prop_assert!(more >= less * (1.0 - 1e-12));
    }
}
