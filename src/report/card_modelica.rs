//! Cards as model text in the Modelica language (Modelica Language Specification 3.6), with no library.
//!
//! One package with a connector of pressure and volume flow and one model a card. A model needs its length;
//! temperature, the choice between best value and proven bounds, a factor on the resistance (for a spread),
//! and whether the inertance counts are parameters. Names become identifiers of letters, digits and
//! underscores; the name as given stays in the comment string, escaped.

use std::collections::BTreeSet;
use std::fmt::Write as _;

use super::card_document::{CardDocument, CardRecord};
use super::numbers::one_line;

/// Keywords of the language (specification, section 2.3.3), its built-in functions and types, which a model of that
/// name would hide from the others, and our own names.
const TAKEN: [&str; 111] = [
    "algorithm",
    "and",
    "annotation",
    "assert",
    "block",
    "break",
    "class",
    "connect",
    "connector",
    "constant",
    "constrainedby",
    "der",
    "discrete",
    "each",
    "else",
    "elseif",
    "elsewhen",
    "encapsulated",
    "end",
    "enumeration",
    "equation",
    "expandable",
    "extends",
    "external",
    "false",
    "final",
    "flow",
    "for",
    "function",
    "if",
    "import",
    "impure",
    "in",
    "initial",
    "inner",
    "input",
    "loop",
    "model",
    "not",
    "operator",
    "or",
    "outer",
    "output",
    "package",
    "parameter",
    "partial",
    "protected",
    "public",
    "pure",
    "record",
    "redeclare",
    "replaceable",
    "return",
    "stream",
    "then",
    "true",
    "type",
    "when",
    "while",
    "within",
    "time",
    "Real",
    "Integer",
    "Boolean",
    "String",
    "Port",
    "abs",
    "acos",
    "asin",
    "atan",
    "atan2",
    "cardinality",
    "ceil",
    "change",
    "cos",
    "cosh",
    "delay",
    "div",
    "edge",
    "exp",
    "floor",
    "homotopy",
    "integer",
    "log",
    "log10",
    "max",
    "min",
    "mod",
    "noEvent",
    "ones",
    "pre",
    "product",
    "reinit",
    "rem",
    "sample",
    "semiLinear",
    "sign",
    "sin",
    "sinh",
    "size",
    "smooth",
    "sqrt",
    "sum",
    "tan",
    "tanh",
    "terminal",
    "terminate",
    "zeros",
    "AssertionLevel",
    "StateSelect",
    "EtchwiseCards",
];

/// Longest identifier made of a name, characters.
const LONGEST_NAME: usize = 60;

/// The connector that all models share.
const CONNECTOR: &str = "  connector Port \"Pressure and volume flow of an incompressible liquid\"
    Real p(unit = \"Pa\") \"Pressure\";
    flow Real V_flow(unit = \"m3/s\") \"Volume flow into the component\";
  end Port;
";

/// The equations that all models share.
const EQUATIONS: &str = "  equation
    assert(temperature >= temperature_low and temperature <= temperature_high,
      \"The temperature is outside the range of the coefficients\");
    assert(noEvent(abs(V_flow)) <= V_flow_high, \"The flow is not laminar: outside the model\",
      AssertionLevel.warning);
    a.V_flow = V_flow;
    b.V_flow = -V_flow;
    dp = a.p - b.p;
    dp = R * V_flow + (if with_inertance then I * der(V_flow) else 0.0);
";

/// The cards as a Modelica package.
///
/// # Examples
/// ```
/// let document = etchwise::report::CardDocument { cards: &[], failed: &[], settings: &[] };
/// let text = etchwise::report::card_modelica(&document);
/// assert!(text.starts_with("package EtchwiseCards") && text.ends_with("end EtchwiseCards;\n"));
/// ```
pub fn card_modelica(document: &CardDocument<'_>) -> String {
    let mut text = format!(
        "package EtchwiseCards \"Channel sections handed over by etchwise {}, SI units\"\n{CONNECTOR}",
        env!("CARGO_PKG_VERSION")
    );
    let mut names = BTreeSet::new();
    for record in document.cards {
        let name = identifier(record.name, &mut names);
        let _ = write!(text, "\n{}", model(record, &name));
    }
    text.push_str("end EtchwiseCards;\n");
    text
}

fn model(record: &CardRecord<'_>, name: &str) -> String {
    let mut text = format!("  model {name} {}\n", string(&described(record)));
    text.push_str(
        "    parameter Real length(unit = \"m\", min = 0.0) \"Length of the channel\";\n",
    );
    text.push_str(&temperatures(record));
    text.push_str(
        "    parameter Integer bound(min = -1, max = 1) = 0 \
         \"-1 proven low resistance, 0 best value, 1 proven high resistance\";\n    \
         parameter Real factor(unit = \"1\", min = 0.0) = 1.0 \"Factor on the resistance, for its spread\";\n    \
         parameter Boolean with_inertance = false \"Whether the inertia of the liquid counts\";\n",
    );
    text.push_str(&constants(record));
    text.push_str(
        "    Port a \"Inlet\";\n    Port b \"Outlet\";\n    \
         Real V_flow(unit = \"m3/s\") \"Volume flow from a to b\";\n    \
         Real dp(unit = \"Pa\") \"Pressure at a less that at b\";\n",
    );
    text.push_str(EQUATIONS);
    let _ = writeln!(text, "  end {name};");
    text
}

/// Name, source and settings in one line.
fn described(record: &CardRecord<'_>) -> String {
    let source = record.source.map_or(String::new(), |source| {
        format!(", from {} (SHA-256 {})", source.path, source.sha256)
    });
    one_line(&format!("{}{source}", record.name))
}

/// The temperature and the factor that follows from it.
fn temperatures(record: &CardRecord<'_>) -> String {
    let Ok(law) = &record.card.temperature_law else {
        let at = record.fluid.temperature.unwrap_or(293.15);
        return format!(
            "    constant Real temperature_low(unit = \"K\") = {at:?} \"The viscosity is known here only\";\n    \
             constant Real temperature_high(unit = \"K\") = {at:?};\n    \
             parameter Real temperature(unit = \"K\") = {at:?} \"Temperature of the liquid\";\n    \
             final parameter Real of_temperature(unit = \"1\") = 1.0 \"R at temperature over R at reference\";\n"
        );
    };
    let x = format!("({:?} / temperature - 1.0)", law.reference);
    let mut polynomial = "0.0".to_owned();
    for c in law.coefficients.iter().rev() {
        polynomial = if polynomial == "0.0" {
            signed(*c)
        } else {
            format!("({} + {x} * {polynomial})", signed(*c))
        };
    }
    format!(
        "    constant Real temperature_low(unit = \"K\") = {:?} \"Lowest temperature of the coefficients\";\n    \
         constant Real temperature_high(unit = \"K\") = {:?} \"Highest temperature of the coefficients\";\n    \
         parameter Real temperature(unit = \"K\") = {:?} \"Temperature of the liquid\";\n    \
         final parameter Real of_temperature(unit = \"1\") = exp({x} * {polynomial})\n      \
         \"R at temperature over R at reference; largest relative error {:.1e}\";\n",
        law.low, law.high, law.reference, law.largest_relative_error
    )
}

/// A number that may stand anywhere in an expression.
fn signed(value: f64) -> String {
    if value < 0.0 {
        format!("({value:?})")
    } else {
        format!("{value:?}")
    }
}

/// The numbers of the card, and resistance and inertance of the channel.
fn constants(record: &CardRecord<'_>) -> String {
    let (card, flow) = (record.card, record.flow);
    let r = card.resistance_per_length.value;
    let (low, high) = card.proven.unwrap_or((r, r));
    let proven = if card.proven.is_some() {
        ""
    } else {
        "; no proven range, best value instead"
    };
    let mut text = String::new();
    let mut constant = |name: &str, unit: &str, value: f64, meaning: &str| {
        let _ = writeln!(
            text,
            "    constant Real {name}(unit = \"{unit}\") = {value:?} \"{meaning}\";"
        );
    };
    constant(
        "R_per_length",
        "Pa.s/m4",
        r,
        "Resistance per length at the reference temperature",
    );
    constant(
        "R_per_length_low",
        "Pa.s/m4",
        low,
        &format!("Proven low value{proven}"),
    );
    constant(
        "R_per_length_high",
        "Pa.s/m4",
        high,
        &format!("Proven high value{proven}"),
    );
    let uncertainty = card.uncertainty.as_ref().map(|u| u.of_log_resistance);
    constant(
        "u_of_log_R",
        "1",
        uncertainty.unwrap_or(0.0),
        if uncertainty.is_some() {
            "Standard uncertainty of ln R from the stated dimensions"
        } else {
            "Standard uncertainty of ln R: none was stated"
        },
    );
    constant(
        "I_per_length",
        "kg/m5",
        card.inertance_per_length.map_or(0.0, |i| i.value),
        if card.inertance_per_length.is_some() {
            "Inertance per length"
        } else {
            "Inertance per length: not known without a density"
        },
    );
    constant("area", "m2", flow.geometry.area, "Volume per length");
    constant(
        "wall_shear_mean",
        "Pa.s/m3",
        card.wall_shear.mean,
        "Mean wall shear per flow at the reference temperature",
    );
    constant(
        "wall_shear_max",
        "Pa.s/m3",
        card.wall_shear.max,
        "Largest wall shear per flow at the reference temperature",
    );
    constant(
        "V_flow_high",
        "m3/s",
        card.limits.flow_rate_high.unwrap_or(f64::MAX),
        "Largest flow that is laminar",
    );
    text.push_str(
        "    final parameter Real R(unit = \"Pa.s/m3\") = factor * length * of_temperature * (if bound < 0 then \
         R_per_length_low elseif bound > 0 then R_per_length_high else R_per_length) \"Resistance\";\n    \
         final parameter Real I(unit = \"kg/m4\") = length * I_per_length \"Inertance\";\n    \
         final parameter Real volume(unit = \"m3\") = length * area \"Volume\";\n",
    );
    text
}

/// A string literal.
fn string(text: &str) -> String {
    let mut literal = String::from("\"");
    for c in text.chars() {
        match c {
            '"' => literal.push_str("\\\""),
            '\\' => literal.push_str("\\\\"),
            c if c.is_control() => literal.push(' '),
            c => literal.push(c),
        }
    }
    literal.push('"');
    literal
}

/// An identifier that is no keyword and not taken yet.
fn identifier(name: &str, taken: &mut BTreeSet<String>) -> String {
    let mut base: String = name
        .chars()
        .take(LONGEST_NAME)
        .map(|c| if c.is_ascii_alphanumeric() { c } else { '_' })
        .collect();
    let starts_well = base.chars().next().is_some_and(|c| c.is_ascii_alphabetic());
    if !starts_well || TAKEN.contains(&base.as_str()) {
        base.insert_str(0, "section_");
    }
    let mut found = base.clone();
    let mut count = 1;
    while !taken.insert(found.clone()) {
        count += 1;
        found = format!("{base}_{count}");
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn identifiers_are_plain_unique_and_no_keywords() {
        let mut taken = BTreeSet::new();
        let made: Vec<String> = [
            "wafer 7",
            "wafer_7",
            "model",
            "exp",
            "7up",
            "\u{b5}",
            "",
            "a\"; end b;",
        ]
        .iter()
        .map(|name| identifier(name, &mut taken))
        .collect();
        assert_eq!(
            made,
            [
                "wafer_7",
                "wafer_7_2",
                "section_model",
                "section_exp",
                "section_7up",
                "section__",
                "section_",
                "a___end_b_"
            ]
        );
    }

    #[test]
    fn string_literals_cannot_be_left() {
        assert_eq!(string("a\"b\\c\nd"), "\"a\\\"b\\\\c d\"");
    }
}
