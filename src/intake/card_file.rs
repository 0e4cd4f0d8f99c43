//! Cards (JSON, `etchwise-card/1`), made by `etchwise card`: the coefficients that a net needs.
//!
//! Units are checked key by key and never assumed. Keys that are not known are passed over, since the form grows by
//! addition; another version is refused.

use serde_json::Value;

use super::network_problem::NetworkProblem;
use super::read_error::{Fault, Place, ReadProblem};
use super::source_text::{SourceText, place_at};

/// Name and version of the form that is read.
const SCHEMA: &str = "etchwise-card/1";

/// What a card is for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CardKind {
    /// A section: coefficients for one metre.
    Section,
    /// A route: coefficients of the whole.
    Route,
}

/// The fluid of a card.
#[derive(Debug, Clone, PartialEq)]
pub struct CardFluid {
    /// Name.
    pub name: String,
    /// K.
    pub temperature: Option<f64>,
    /// Pa s.
    pub viscosity: f64,
    /// kg/m^3.
    pub density: Option<f64>,
}

/// Resistance over temperature, `R(T) = R(T0) exp(c1 x + c2 x^2 + ...)`, `x = T0/T - 1`.
#[derive(Debug, Clone, PartialEq)]
pub struct CardLaw {
    /// `T0`, K.
    pub reference: f64,
    /// Lowest temperature, K.
    pub low: f64,
    /// Highest temperature, K.
    pub high: f64,
    /// `c1`, `c2`, and so on.
    pub coefficients: Vec<f64>,
    /// Largest relative error.
    pub largest_relative_error: f64,
}

/// One card; a section's coefficients are per length.
#[derive(Debug, Clone, PartialEq)]
pub struct CardContent {
    /// Name in its file.
    pub name: String,
    /// What it is for.
    pub kind: CardKind,
    /// The fluid.
    pub fluid: CardFluid,
    /// Pa s/m^4 or Pa s/m^3.
    pub resistance: f64,
    /// Its proven range.
    pub proven: Option<(f64, f64)>,
    /// Its standard relative uncertainty.
    pub relative_uncertainty: Option<f64>,
    /// kg/m^5 or kg/m^4.
    pub inertance: Option<f64>,
    /// m^2 or m^3.
    pub volume: f64,
    /// m or m^2.
    pub wall_area: f64,
    /// Length of a route, m.
    pub length: Option<f64>,
    /// Mean wall shear per flow rate, Pa s/m^3.
    pub shear_mean: Option<f64>,
    /// Largest wall shear per flow rate, Pa s/m^3.
    pub shear_max: Option<f64>,
    /// Resistance over temperature.
    pub law: Option<CardLaw>,
    /// Largest Reynolds number.
    pub reynolds_high: Option<f64>,
    /// Share of the length that the entrance may take.
    pub entrance_share: Option<f64>,
    /// Largest pressure drop, Pa.
    pub pressure_drop_high: Option<f64>,
    /// Codes of its warnings that are no mere cautions.
    pub warnings: Vec<String>,
}

/// All cards of a file.
pub(super) fn cards(bytes: Vec<u8>) -> Result<Vec<CardContent>, Fault> {
    let source = SourceText::decode(bytes)?;
    if source.text.trim().is_empty() {
        let message = "the file is empty".to_owned();
        return Err(of(NetworkProblem::Json { message }));
    }
    let root: Value = serde_json::from_str(&source.text).map_err(|e| bad_json(&source.text, &e))?;
    match root.get("schema") {
        Some(Value::String(schema)) if schema == SCHEMA => {}
        found => {
            let found = match found {
                Some(Value::String(schema)) => format!("\"{}\"", one_line(schema)),
                Some(_) => "no text".to_owned(),
                None => "not there".to_owned(),
            };
            return Err(of(NetworkProblem::Schema { found }));
        }
    }
    let Some(list) = root.get("cards").and_then(Value::as_array) else {
        return Err(key("cards", "there is no list of cards"));
    };
    if list.is_empty() {
        return Err(key("cards", "the list of cards is empty"));
    }
    let read = list.iter().enumerate().map(|(index, value)| {
        let part = Part {
            value,
            path: format!("cards[{index}]"),
        };
        card(&part)
    });
    read.collect()
}

/// Text with control characters and marks that reorder it made blanks, so that it stays on one line.
pub(super) fn one_line(text: &str) -> String {
    let is_mark = |c: char| matches!(c, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{2028}' | '\u{2029}');
    let plain = |c: char| if c.is_control() || is_mark(c) { ' ' } else { c };
    text.chars().map(plain).collect()
}

fn of(source: NetworkProblem) -> Fault {
    ReadProblem::Network { source }.into()
}

fn key(key: &str, problem: impl Into<String>) -> Fault {
    of(NetworkProblem::CardKey {
        key: key.to_owned(),
        problem: problem.into(),
    })
}

/// A fault of the JSON reader at its line and column.
fn bad_json(text: &str, error: &serde_json::Error) -> Fault {
    let lines = text
        .split_inclusive('\n')
        .take(error.line().saturating_sub(1));
    let before: usize = lines.map(str::len).sum();
    // The reader counts bytes of the line, from 1.
    let offset = before + error.column().saturating_sub(1);
    let message = error.to_string();
    let message = match message.rsplit_once(" at line ") {
        Some((first, _)) => first.to_owned(),
        None => message,
    };
    let place: Place = place_at(text, offset);
    Fault {
        place: Some(Box::new(place)),
        problem: Box::new(ReadProblem::Network {
            source: NetworkProblem::Json { message },
        }),
    }
}

/// An object with its way from the top, for messages.
struct Part<'a> {
    value: &'a Value,
    path: String,
}

/// A number with what stands beside it.
struct Number {
    value: f64,
    proven: Option<(f64, f64)>,
    uncertainty: Option<f64>,
}

impl<'a> Part<'a> {
    fn path(&self, name: &str) -> String {
        format!("{}.{name}", self.path)
    }

    /// An inner object; `None` where it is null or not there.
    fn inner(&self, name: &str) -> Result<Option<Part<'a>>, Fault> {
        match self.value.get(name) {
            None | Some(Value::Null) => Ok(None),
            Some(value) if value.is_object() => Ok(Some(Part {
                value,
                path: self.path(name),
            })),
            Some(_) => Err(key(&self.path(name), "it is no object")),
        }
    }

    fn text(&self, name: &str) -> Result<&'a str, Fault> {
        let found = self.value.get(name).and_then(Value::as_str);
        found.ok_or_else(|| key(&self.path(name), "there is no text"))
    }

    /// A quantity with its unit checked; `None` where it, or its value, is null or not there.
    fn quantity(&self, name: &str, unit: &str) -> Result<Option<Number>, Fault> {
        match self.inner(name)? {
            Some(part) => part.number(unit),
            None => Ok(None),
        }
    }

    /// The value of this quantity.
    fn number(&self, unit: &str) -> Result<Option<Number>, Fault> {
        let number = |name: &str| match self.value.get(name) {
            None | Some(Value::Null) => Ok(None),
            Some(value) => match value.as_f64().filter(|v| v.is_finite()) {
                Some(number) => Ok(Some(number)),
                None => Err(key(&self.path(name), "it is no finite number")),
            },
        };
        let Some(value) = number("value")? else {
            return Ok(None);
        };
        match self.value.get("unit").and_then(Value::as_str) {
            Some(found) if found == unit => {}
            Some(found) => {
                let problem = format!("the unit is `{}`, it must be `{unit}`", one_line(found));
                return Err(key(&self.path, problem));
            }
            None => {
                return Err(key(
                    &self.path,
                    format!("there is no unit; it must be `{unit}`"),
                ));
            }
        }
        let proven = number("low")?.zip(number("high")?);
        if proven.is_some_and(|(low, high)| !(low <= value && value <= high)) {
            return Err(key(&self.path, "the value is not between `low` and `high`"));
        }
        let uncertainty = number("u")?;
        if uncertainty.is_some_and(|u| u < 0.0) {
            return Err(key(&self.path("u"), "it is negative"));
        }
        if uncertainty.is_some_and(|u| u > value.abs()) {
            return Err(key(&self.path("u"), "it is larger than the value itself"));
        }
        Ok(Some(Number {
            value,
            proven,
            uncertainty,
        }))
    }

    /// A value that may be missing.
    fn maybe(&self, name: &str, unit: &str) -> Result<Option<f64>, Fault> {
        Ok(self.quantity(name, unit)?.map(|number| number.value))
    }

    /// A quantity above zero that must be there.
    fn positive(&self, name: &str, unit: &str) -> Result<Number, Fault> {
        let Some(number) = self.quantity(name, unit)? else {
            return Err(key(
                &self.path(name),
                format!("there is no number in `{unit}`"),
            ));
        };
        let low = number.proven.map_or(number.value, |(low, _)| low);
        if low <= 0.0 {
            return Err(key(&self.path(name), "it is not above zero"));
        }
        Ok(number)
    }
}

fn card(part: &Part<'_>) -> Result<CardContent, Fault> {
    if !part.value.is_object() {
        return Err(key(&part.path, "it is no object"));
    }
    let kind = match part.text("kind")? {
        "section" => CardKind::Section,
        "route" => CardKind::Route,
        other => {
            let problem = format!("`{}` is neither `section` nor `route`", one_line(other));
            return Err(key(&part.path("kind"), problem));
        }
    };
    let names = match kind {
        CardKind::Section => [
            ("resistance_per_length", "Pa s/m^4"),
            ("inertance_per_length", "kg/m^5"),
            ("volume_per_length", "m^2"),
            ("wall_area_per_length", "m"),
        ],
        CardKind::Route => [
            ("resistance", "Pa s/m^3"),
            ("inertance", "kg/m^4"),
            ("volume", "m^3"),
            ("wall_area", "m^2"),
        ],
    };
    let [resistance, inertance, volume, wall_area] = names;
    let found = part.positive(resistance.0, resistance.1)?;
    let shear = part.inner("wall_shear_per_flow_rate")?;
    let shear_of = |name: &str| match &shear {
        Some(shear) => shear.maybe(name, "Pa s/m^3"),
        None => Ok(None),
    };
    let validity = part.inner("validity")?;
    let limit = |name: &str, unit: &str| match &validity {
        Some(validity) => validity.maybe(name, unit),
        None => Ok(None),
    };
    let length = match kind {
        CardKind::Section => None,
        CardKind::Route => Some(part.positive("length", "m")?.value),
    };
    Ok(CardContent {
        name: one_line(part.text("name")?),
        kind,
        fluid: fluid(part)?,
        resistance: found.value,
        proven: found.proven,
        relative_uncertainty: found.uncertainty.map(|u| u / found.value),
        inertance: part.maybe(inertance.0, inertance.1)?,
        volume: part.positive(volume.0, volume.1)?.value,
        wall_area: part.positive(wall_area.0, wall_area.1)?.value,
        length,
        shear_mean: shear_of("mean")?,
        shear_max: shear_of("max")?,
        law: law(part)?,
        reynolds_high: limit("reynolds_high", "1")?,
        entrance_share: limit("entrance_share", "1")?,
        pressure_drop_high: limit("pressure_drop_high", "Pa")?,
        warnings: warnings(part),
    })
}

fn fluid(part: &Part<'_>) -> Result<CardFluid, Fault> {
    let Some(fluid) = part.inner("fluid")? else {
        return Err(key(&part.path("fluid"), "there is no fluid"));
    };
    Ok(CardFluid {
        name: one_line(fluid.text("name")?),
        temperature: fluid.maybe("temperature", "K")?,
        viscosity: fluid.positive("viscosity", "Pa s")?.value,
        density: fluid.maybe("density", "kg/m^3")?,
    })
}

fn law(part: &Part<'_>) -> Result<Option<CardLaw>, Fault> {
    let Some(law) = part.inner("temperature_law")? else {
        return Ok(None);
    };
    let list = law.value.get("coefficients").and_then(Value::as_array);
    let path = law.path("coefficients");
    let Some(list) = list.filter(|list| (1..=4).contains(&list.len())) else {
        return Err(key(&path, "there are not 1 to 4 coefficients"));
    };
    let mut coefficients = Vec::new();
    for (index, value) in list.iter().enumerate() {
        let one = Part {
            value,
            path: format!("{path}[{index}]"),
        };
        let Some(number) = one.number("1")? else {
            return Err(key(&one.path, "there is no number"));
        };
        coefficients.push(number.value);
    }
    let found = CardLaw {
        reference: law.positive("reference_temperature", "K")?.value,
        low: law.positive("temperature_low", "K")?.value,
        high: law.positive("temperature_high", "K")?.value,
        coefficients,
        largest_relative_error: law
            .maybe("largest_relative_error", "1")?
            .unwrap_or(f64::NAN),
    };
    if !found.largest_relative_error.is_finite() {
        return Err(key(
            &law.path("largest_relative_error"),
            "there is no number",
        ));
    }
    Ok(Some(found))
}

/// Codes of warnings, without mere cautions.
fn warnings(part: &Part<'_>) -> Vec<String> {
    let list = part.value.get("warnings").and_then(Value::as_array);
    let codes = list.into_iter().flatten();
    let mut found: Vec<String> = codes
        .filter_map(|warning| warning.get("code")?.as_str())
        .filter(|code| *code != "caution")
        .map(one_line)
        .collect();
    found.sort();
    found.dedup();
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    /// An invented card.
    const CARD: &str = r#"{"schema": "etchwise-card/1", "cards": [{
      "name": "a\nb", "kind": "section", "more": 1,
      "fluid": {"name": "water", "temperature": {"value": 298.15, "unit": "K"},
        "viscosity": {"value": 0.00089, "unit": "Pa s"}, "density": {"value": null, "unit": "kg/m^3"}},
      "resistance_per_length": {"value": 2e15, "unit": "Pa s/m^4", "low": 1.9e15, "high": 2.1e15, "u": 4e13},
      "volume_per_length": {"value": 4e-9, "unit": "m^2"},
      "wall_area_per_length": {"value": 2.8e-4, "unit": "m"},
      "temperature_law": null, "warnings": [{"code": "caution"}, {"code": "gas_limits"}]}]}"#;

    fn error(from: &str, to: &str) -> String {
        assert!(CARD.contains(from), "{from}");
        let fault = cards(CARD.replace(from, to).into_bytes()).unwrap_err();
        fault.in_file("card.json").to_string()
    }

    #[test]
    fn a_card_is_read_with_its_uncertainty_and_what_is_absent() {
        let read = cards(CARD.as_bytes().to_vec()).unwrap();
        let card = &read[0];
        assert_eq!(card.name, "a b");
        assert_eq!(card.proven, Some((1.9e15, 2.1e15)));
        assert_eq!(card.relative_uncertainty, Some(0.02));
        assert_eq!(
            (card.inertance, card.fluid.density, card.shear_max),
            (None, None, None)
        );
        assert_eq!(card.warnings, ["gas_limits"]);
    }

    #[test]
    fn what_is_wrong_is_named_with_its_place() {
        for (from, to, words) in [
            ("card/1", "card/2", "\"etchwise-card/2\""),
            ("\"schema\": \"etchwise-card/1\", ", "", "not there"),
            (
                "Pa s/m^4",
                "Pa s/m^3",
                "cards[0].resistance_per_length`: the unit is `Pa s/m^3`",
            ),
            ("\"unit\": \"m^2\"", "\"u\": 0", "there is no unit"),
            ("2e15,", "-2e15,", "not between"),
            ("1.9e15", "-1e15", "not above zero"),
            ("2e15,", "\"2\",", "no finite number"),
            ("2e15,", "null,", "there is no number in `Pa s/m^4`"),
            ("\"section\"", "\"pipe\"", "neither `section` nor `route`"),
            ("\"section\"", "\"route\"", "cards[0].resistance`"),
            (
                "\"temperature_law\": null",
                "\"temperature_law\": {}",
                "1 to 4 coefficients",
            ),
            ("\"more\": 1,", "\"more\": 1", "card.json:3:"),
        ] {
            let message = error(from, to);
            assert!(message.contains(words), "{from}: {message}");
        }
        for text in [
            "",
            "[]",
            "{}",
            "null",
            "{\"schema\": \"etchwise-card/1\", \"cards\": []}",
        ] {
            assert!(cards(text.as_bytes().to_vec()).is_err(), "{text}");
        }
        let deep = "[".repeat(100_000);
        assert!(cards(deep.into_bytes()).is_err());
    }
}
