//! The text view of a response table: ranges, errors, trends, the formula with all coefficients, a short table.

use super::document::{ResponseDocument, ShownUnit};
use super::formula::{POLYNOMIALS, factors, scaled_text};
use crate::report::numbers::{one_line, per_cent, significant};
use crate::report::table::{Align, Table, paragraph};
use crate::report::text::{TextOptions, counted, finished, part, title, warnings};
use crate::study::{NUMERICAL_SHARE, ParameterScale, ResponseParameter, TrendCheck};

/// Most points along each parameter in the text, by the number of parameters.
const SHOWN: [usize; 3] = [9, 5, 3];

/// The document as text, ended by a line feed.
pub fn response_text(document: &ResponseDocument<'_>, options: TextOptions) -> String {
    let units = document.units();
    let mut parts = vec![
        title(document.name, document.source),
        ranges(document, &units),
        accuracy(document),
        trends(document, &units),
        formula(document, &units),
        points(document, &units, options.verbose),
    ];
    parts.extend(warnings(&document.all_warnings()));
    finished(&parts, options)
}

fn ranges(document: &ResponseDocument<'_>, units: &[ShownUnit]) -> String {
    let mut table = Table::new(&[Align::Left, Align::Left]);
    let parameters = document.table.parameters.iter();
    for (parameter, unit) in parameters.zip(units) {
        let range = format!(
            "{} to {}",
            unit.with(parameter.low, 5),
            unit.with(parameter.high, 5)
        );
        table.row([one_line(&parameter.name), range]);
    }
    for (name, value) in document.fixed {
        table.row([one_line(name), format!("{}, fixed", one_line(value))]);
    }
    if let Some(fluid) = document.fluid {
        let temperature = fluid
            .temperature
            .map_or(String::new(), |t| format!(" at {} K", significant(t, 5)));
        let viscosity = significant(fluid.viscosity, 6);
        table.row([
            "fluid".to_owned(),
            format!(
                "{}{temperature}, viscosity mu {viscosity} Pa s",
                one_line(&fluid.name)
            ),
        ]);
    }
    let mut text = part("Ranges", &table);
    let parameters = document.table.parameters.iter();
    for parameter in parameters {
        let line = format!("{}: {}", parameter.name, parameter.definition);
        text.push_str(&paragraph("  ", &one_line(&line)));
    }
    text
}

fn accuracy(document: &ResponseDocument<'_>) -> String {
    let (errors, table) = (&document.table.errors, document.table);
    let mut rows = Table::new(&[Align::Left, Align::Left, Align::Left]);
    let reached = if errors.is_met() {
        "reached"
    } else {
        "not reached"
    };
    rows.row([
        "fit error, largest on fresh points".to_owned(),
        per_cent(errors.fresh),
        format!(
            "{} points, asked {}: {reached}",
            table.fresh.len(),
            per_cent(errors.asked)
        ),
    ]);
    rows.row([
        "fit error, root mean square there".to_owned(),
        per_cent(errors.fresh_mean_square),
    ]);
    rows.row([
        "fit error, largest in the table".to_owned(),
        per_cent(errors.table),
        counted(table.points.len(), "point", "points"),
    ]);
    rows.row([
        "numerical error of K, largest".to_owned(),
        per_cent(errors.numerical),
        format!(
            "estimated, aimed at {}",
            per_cent(NUMERICAL_SHARE * errors.asked)
        ),
    ]);
    rows.row([
        "stated error of the formula".to_owned(),
        per_cent(errors.stated()),
        "fit error and numerical error together".to_owned(),
    ]);
    rows.row([
        "proven range of K, widest".to_owned(),
        errors.proven_width.map_or("none".to_owned(), per_cent),
        "holds at the points of the table, not between them".to_owned(),
    ]);
    format!(
        "{}{}",
        part("Errors, relative", &rows),
        paragraph(
            "  ",
            "Fresh points took no part in the fit. Use the formula inside the ranges only: outside them it says \
             nothing, and polynomials leave the truth fast."
        )
    )
}

fn trends(document: &ResponseDocument<'_>, units: &[ShownUnit]) -> String {
    let mut text = "Rise and fall\n".to_owned();
    let pairs = document.table.parameters.iter().zip(&document.table.trends);
    for ((parameter, trend), unit) in pairs.zip(units) {
        text.push_str(&paragraph("  ", &trend_line(parameter, trend, *unit)));
    }
    text
}

fn trend_line(parameter: &ResponseParameter, trend: &TrendCheck, unit: ShownUnit) -> String {
    let name = one_line(&parameter.name);
    let found = trend.found.map_or("rises and falls", |t| t.word());
    // Slopes in the parameter itself are shown in its unit.
    let is_linear = parameter.scale() == ParameterScale::Linear;
    let (slope, size) = if is_linear {
        (format!("dlnK/d({name})"), unit.size)
    } else {
        (format!("dlnK/dln({name})"), 1.0)
    };
    let per = if is_linear && !unit.name.is_empty() {
        format!(" per {}", unit.name)
    } else {
        String::new()
    };
    let [low, high] = trend.slopes.map(|s| significant(s * size, 4));
    let verdict = match trend.expected {
        None => "no rule asks for either".to_owned(),
        Some(_) if trend.holds() => format!(
            "as it must: at all {} places of the fit and in all {} pairs of the table",
            trend.places, trend.pairs
        ),
        Some(expected) => format!(
            "but it {} by rule: not so at {} of {} places of the fit, by up to {} of K, and in {} of {} pairs of the \
             table",
            expected.word(),
            trend.wrong_places,
            trend.places,
            per_cent(trend.largest_fall),
            trend.wrong_pairs,
            trend.pairs
        ),
    };
    format!(
        "K {found} with {name}, {verdict}; {slope} {low} to {high}{per}. Rule: {}.",
        trend.because
    )
}

fn formula(document: &ResponseDocument<'_>, units: &[ShownUnit]) -> String {
    let fit = &document.table.fit;
    let mut text = "Formula\n  ln(K / m^4) = sum of coefficient times polynomials".to_owned();
    text.push_str(", R' = mu / K\n");
    for (axis, parameter) in document.table.parameters.iter().enumerate() {
        text.extend(["  ", &scaled_text(axis, parameter), "\n"]);
    }
    text.push_str(&paragraph("  ", POLYNOMIALS));
    let mut table = Table::new(&[Align::Right, Align::Left]);
    table.row(["coefficient", "polynomials"]);
    for term in &fit.terms {
        let factors = factors(term);
        let factors = if factors.is_empty() {
            "1".to_owned()
        } else {
            factors
        };
        table.row([format!("{:.9}", term.coefficient), factors]);
    }
    text.push_str(&table.print(2));
    let (middle, k) = document.table.middle();
    let pairs = document.table.parameters.iter().zip(units).zip(&middle);
    let places = pairs.map(|((p, unit), v)| format!("{} = {}", p.name, unit.with(*v, 7)));
    let check = format!(
        "To check a copy: at {} the formula gives K = {} m^4. Coefficients are rounded here to 1e-9; --json has all \
         digits.",
        places.collect::<Vec<_>>().join(", "),
        significant(k, 8)
    );
    text.push_str(&paragraph("  ", &one_line(&check)));
    text
}

fn points(document: &ResponseDocument<'_>, units: &[ShownUnit], all: bool) -> String {
    let parameters = &document.table.parameters;
    let most = SHOWN[parameters.len().clamp(1, 3) - 1];
    let shown = document.shown_points(if all { usize::MAX } else { most });
    let has_fluid = document.fluid.is_some();
    let count = parameters.len() + 4 + usize::from(has_fluid);
    let mut table = Table::new(&vec![Align::Right; count]);
    let mut heads: Vec<String> = parameters
        .iter()
        .zip(units)
        .map(|(p, unit)| unit.head(&one_line(&p.name)))
        .collect();
    heads.extend(["K / m^4", "proven width", "fit / m^4", "fit off by"].map(str::to_owned));
    if has_fluid {
        heads.push("R' / (Pa s/m^4)".to_owned());
    }
    table.row(heads);
    for point in &shown {
        let mut row: Vec<String> = point
            .values
            .iter()
            .zip(units)
            .map(|(v, unit)| significant(v / unit.size, 5))
            .collect();
        row.push(significant(point.conductance.value, 7));
        row.push(point.proven_width().map_or("none".to_owned(), per_cent));
        row.push(significant(point.fitted, 7));
        row.push(per_cent(point.relative_difference()));
        row.extend(
            document
                .resistance(point.conductance.value)
                .map(|r| significant(r, 6)),
        );
        table.row(row);
    }
    let total = document.table.points.len();
    let heading = if shown.len() == total {
        format!("Table, {}", counted(total, "point", "points"))
    } else {
        format!(
            "Table, {} of {total} points (all with --verbose, --csv or --json)",
            shown.len()
        )
    };
    part(&heading, &table)
}
