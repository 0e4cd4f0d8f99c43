//! Tables of what is read and what is refused.

use super::*;

fn close(read: Result<f64, UnitError>, expected: f64, text: &str) {
    let read = read.unwrap_or_else(|error| panic!("{text}: {error}"));
    assert!(
        (read - expected).abs() <= 4.0 * f64::EPSILON * expected.abs(),
        "{text}: {read} against {expected}"
    );
}

#[test]
fn lengths_in_every_spelling() {
    for (text, metres) in [
        ("2 m", 2.0),
        ("2 cm", 0.02),
        ("2mm", 2e-3),
        ("30um", 3e-5),
        ("30 um", 3e-5),
        ("30 \u{b5}m", 3e-5),
        ("30 \u{3bc}m", 3e-5),
        ("30\u{a0}\u{b5}m", 3e-5),
        ("30 micron", 3e-5),
        ("30 microns", 3e-5),
        ("3e-5 m", 3e-5),
        ("3E+1um", 3e-5),
        ("3\u{d7}10^-5 m", 3e-5),
        ("3 x 10^-5 m", 3e-5),
        (".5 nm", 5e-10),
        ("7. pm", 7e-12),
        ("12 A", 1.2e-9),
        ("12 \u{c5}", 1.2e-9),
        ("12 \u{212b}", 1.2e-9),
        ("12 angstrom", 1.2e-9),
        ("1 inch", 0.0254),
        ("1 in", 0.0254),
        ("10 mil", 2.54e-4),
        ("10 thou", 2.54e-4),
        ("-5 um", -5e-6),
        ("\u{2212}5 um", -5e-6),
        ("+5 um", 5e-6),
    ] {
        close(parse_length(text), metres, text);
    }
    assert_eq!(parse_length("30 um").unwrap().to_bits(), 3e-5_f64.to_bits());
}

#[test]
fn pressures_flow_rates_viscosities_and_densities() {
    for (text, pascals) in [
        ("1 Pa", 1.0),
        ("30 kPa", 3e4),
        ("1 MPa", 1e6),
        ("1 hPa", 100.0),
        ("2 bar", 2e5),
        ("2 mbar", 200.0),
        ("1 psi", 6_894.757_293_168_361),
        ("1 mmHg", 133.322_387_415),
        ("1 atm", 101_325.0),
        ("1 N/m^2", 1.0),
        ("10 dyn/cm^2", 1.0),
        ("10 dyn/cm\u{b2}", 1.0),
    ] {
        close(parse_pressure(text), pascals, text);
    }
    for (text, rate) in [
        ("6 uL/min", 1e-10),
        ("6 \u{b5}L/min", 1e-10),
        ("6uL/min", 1e-10),
        ("3.6 mL/h", 1e-9),
        ("1 nL/s", 1e-12),
        ("1 L/min", 1e-3 / 60.0),
        ("1 mm^3/s", 1e-9),
        ("1 mm3/s", 1e-9),
        ("1 m\u{b3}/s", 1.0),
        ("1 m^3 s^-1", 1.0),
    ] {
        close(parse_flow_rate(text), rate, text);
    }
    for text in [
        "1 mPa s",
        "1 mPa\u{b7}s",
        "1 mPa*s",
        "1 mPa.s",
        "1000 uPa s",
        "1 cP",
        "0.01 P",
        "1e-3 Pa s",
    ] {
        close(parse_viscosity(text), 1e-3, text);
    }
    assert!(parse_viscosity("1 N s/m^2e0").is_err());
    for text in ["998 kg/m^3", "0.998 g/cm^3", "0.998 g/mL", "0.998 kg/L"] {
        close(parse_density(text), 998.0, text);
    }
}

#[test]
fn compound_units_with_parentheses() {
    let unit = read_unit("mbar/(uL/min)").unwrap();
    close(Ok(unit.scale.factor()), 6e12, "mbar/(uL/min)");
    let unit = read_unit("GPa s/m^3").unwrap();
    close(Ok(unit.scale.factor()), 1e9, "GPa s/m^3");
    assert!(read_unit("uL/min cm").is_none(), "ambiguous after a slash");
    for bad in [
        "",
        "/",
        "m/",
        "(m",
        "m)",
        "m^",
        "m^0",
        "m^99",
        "**",
        "m//s",
        "((((((((((m",
    ] {
        assert!(read_unit(bad).is_none(), "{bad}");
    }
}

#[test]
fn temperatures_angles_and_fractions() {
    for text in [
        "25 C",
        "25 degC",
        "25 \u{b0}C",
        "25\u{b0}C",
        "298.15 K",
        "25 \u{2103}",
    ] {
        close(parse_temperature(text), 298.15, text);
    }
    assert!(matches!(
        parse_temperature("-300 C"),
        Err(UnitError::BelowAbsoluteZero { .. })
    ));
    assert!(parse_temperature("77 F").is_err());
    assert!(parse_temperature("25").is_err());
    close(parse_angle("180 deg"), std::f64::consts::PI, "180 deg");
    close(
        parse_angle("90\u{b0}"),
        std::f64::consts::FRAC_PI_2,
        "90\u{b0}",
    );
    close(parse_angle("0.5 rad"), 0.5, "0.5 rad");
    assert!(parse_angle("0.5").is_err());
    close(parse_fraction("0.1%"), 1e-3, "0.1%");
    close(parse_fraction("0.1 %"), 1e-3, "0.1 %");
    close(parse_fraction("200 ppm"), 2e-4, "200 ppm");
    close(parse_fraction("0.25"), 0.25, "0.25");
    assert!(parse_fraction("1 um").is_err());
}

#[test]
fn what_is_refused_and_why() {
    let is = |text: &str, wanted: fn(&UnitError) -> bool| {
        let error = parse_length(text).expect_err(text);
        assert!(wanted(&error), "{text}: {error:?}");
        assert!(!error.hint().is_empty());
        assert!(!error.to_string().is_empty());
    };
    is("", |e| matches!(e, UnitError::NoNumber { .. }));
    is("um", |e| matches!(e, UnitError::NoNumber { .. }));
    is("- um", |e| matches!(e, UnitError::NoNumber { .. }));
    is("1 2 um", |e| matches!(e, UnitError::NoNumber { .. }));
    is("30", |e| matches!(e, UnitError::NoUnit { .. }));
    is("1,5 mm", |e| matches!(e, UnitError::DecimalComma { .. }));
    is("1.000.541 mm", |e| {
        matches!(e, UnitError::SecondPoint { .. })
    });
    is("inf m", |e| matches!(e, UnitError::NotFinite { .. }));
    is("NaN m", |e| matches!(e, UnitError::NotFinite { .. }));
    is("1e999 m", |e| matches!(e, UnitError::NotFinite { .. }));
    is("5 \u{fffd}m", |e| {
        matches!(e, UnitError::DestroyedCharacter { .. })
    });
    for wrong in [
        "5 km", "5 UM", "5 kA", "5 M", "5 Pa", "5 m^2", "5 um/s", "5 e", "5 dm",
    ] {
        is(wrong, |e| matches!(e, UnitError::UnknownUnit { .. }));
    }
    let error = parse_length("5 MM").unwrap_err();
    assert_eq!(error.hint(), "case matters in units: did you mean `mm`?");
    assert!(parse_pressure("5 KPa").unwrap_err().hint().contains("kPa"));
    assert_ne!(parse_pressure("1 mPa"), parse_pressure("1 MPa"));
}

proptest::proptest! {
    #[test]
    fn no_text_panics(text in "\\PC{0,24}") {
        for quantity in [Quantity::Length, Quantity::FlowRate, Quantity::Viscosity] {
            if let Ok(value) = parse_quantity(&text, quantity) {
                proptest::prop_assert!(value.is_finite());
            }
        }
        let _ = (parse_temperature(&text), parse_angle(&text), parse_fraction(&text));
    }

    #[test]
    fn unit_like_text_never_panics(text in "[-+0-9.e,]{0,6} ?[mkgsPaulLhinb()/*^ .\u{b5}\u{b2}\u{fffd}-]{0,12}") {
        let _ = parse_length(&text);
        let _ = parse_flow_rate(&text);
    }
}
