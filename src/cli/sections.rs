//! From a section as read to the sections that are solved: its own, under a film where one is asked for,
//! and the inner and outer one of its reach.

use clap::ArgMatches;

use crate::flow::{SectionFlow, SolveOptions, SolvedSection, solve_outline};
use crate::geometry::curves::CHORD_TOLERANCE;
use crate::geometry::{Film, FilmOn, FilmReport, Filmed, NEGLIGIBLE_LUMENS, Outline};
use crate::intake::Section;
use crate::report::AlternativeRecord;
use crate::study::{Assumption, Reach, ReachSides, solve_for_sensitivity, under_assumption};
use crate::units;

use super::failure::Failure;
use super::input::{CheckedSection, refuse_problems};
use super::quantities::{positive, quantity};

/// Share of the tolerance that lumens left out under a film may take.
const LEFT_OUT_OF_TOLERANCE: f64 = 0.05;

/// What is to be solved.
pub(super) struct Sections {
    /// The section, under its film.
    pub(super) outline: Outline,
    pub(super) film: Option<FilmReport>,
    reach: Option<Sides>,
}

/// Inner and outer section, under their films.
struct Sides {
    inner: Option<Outline>,
    outer: Option<Outline>,
    conductance_left_out: f64,
}

/// The film asked for.
pub(super) fn film(matches: &ArgMatches) -> Result<Option<Film>, Failure> {
    let thickness = quantity(matches, "film", units::parse_length)?;
    positive(matches, "film", thickness, "0.5um")?;
    let word = matches.get_one::<String>("film-on");
    let on = FilmOn::ALL
        .into_iter()
        .find(|on| word.is_some_and(|w| w == on.word()))
        .unwrap_or_default();
    Ok(thickness.map(|thickness| Film { thickness, on }))
}

impl Sections {
    /// Checks the reach and applies the film to all sections.
    ///
    /// - `tolerance`: of the conductance; what the film may leave out stays far below
    pub(super) fn new(
        checked: &CheckedSection,
        film: Option<&Film>,
        tolerance: f64,
    ) -> Result<Self, Failure> {
        let mut sections = Self {
            outline: checked.outline.clone(),
            film: None,
            reach: Self::sides(checked)?,
        };
        sections.prove_reach()?;
        let Some(film) = film else {
            return Ok(sections);
        };
        let negligible = negligible(tolerance);
        if let Some(sides) = &mut sections.reach {
            sides.put_under(film, &checked.outline, negligible)?;
        }
        let Filmed { outline, report } = film.applied_within(&checked.outline, negligible)?;
        sections.outline = outline;
        sections.film = Some(report);
        sections.prove_reach().map_err(|failure| {
            let advice = "\nhelp: this is with the film on; as given they lie inside each other. \
                          Leave the film or [reach] out, or put the film on all walls";
            Failure {
                text: failure.text + advice,
                ..failure
            }
        })?;
        Ok(sections)
    }

    fn sides(checked: &CheckedSection) -> Result<Option<Sides>, Failure> {
        let Some(reach) = &checked.section.extras.reach else {
            return Ok(None);
        };
        let path = &checked.section.provenance.path;
        let side = |side: &Option<crate::intake::ReachSection>, word: &str| match side {
            None => Ok(None),
            Some(section) => {
                refuse_problems(&section.outline, &format!("{path}: reach.{word}"), "")?;
                let (outline, _) = section.outline.clone().without_duplicate_vertices();
                Ok::<_, Failure>(Some(outline))
            }
        };
        Ok(Some(Sides {
            inner: side(&reach.inner, "inner")?,
            outer: side(&reach.outer, "outer")?,
            conductance_left_out: 0.0,
        }))
    }

    fn prove_reach(&self) -> Result<(), Failure> {
        if let Some(sides) = &self.reach {
            sides.borrowed().prove_around(&self.outline)?;
        }
        Ok(())
    }

    /// Solves the section; its proven high value also holds for the lumens that the film left out.
    pub(super) fn solve(&self, options: &SolveOptions) -> Result<SolvedSection, Failure> {
        Ok(solve_outline(&self.outline, &self.with_left_out(options))?)
    }

    /// The same on a grid fine enough for integrals over the wall.
    pub(super) fn solve_for_walls(&self, options: &SolveOptions) -> Result<SolvedSection, Failure> {
        let options = self.with_left_out(options);
        Ok(solve_for_sensitivity(&self.outline, &options)?)
    }

    /// With what the film left out, for the proven high value.
    fn with_left_out(&self, options: &SolveOptions) -> SolveOptions {
        SolveOptions {
            conductance_left_out: self.film.as_ref().map_or(0.0, |f| f.conductance_left_out),
            ..*options
        }
    }

    /// Solves the inner and outer section, where they are given.
    pub(super) fn reach(
        &self,
        flow: &SectionFlow,
        options: &SolveOptions,
    ) -> Result<Option<Reach>, Failure> {
        let Some(sides) = &self.reach else {
            return Ok(None);
        };
        let reach = Reach::new(&self.outline, flow, &sides.borrowed(), options)?;
        Ok(Some(reach))
    }
}

impl Sides {
    fn borrowed(&self) -> ReachSides<'_> {
        ReachSides {
            inner: self.inner.as_ref(),
            outer: self.outer.as_ref(),
            conductance_left_out: self.conductance_left_out,
        }
    }

    /// Puts both under a film, the inner one a little thicker, the outer one a little thinner than the
    /// section's: by more than the chords of round new walls, which then cannot cross.
    fn put_under(
        &mut self,
        film: &Film,
        section: &Outline,
        negligible: f64,
    ) -> Result<(), Failure> {
        let (low, high) = section.bounds().unwrap_or_default();
        let side = (high[0] - low[0]).min(high[1] - low[1]);
        let margin = (4.0 * CHORD_TOLERANCE * side).min(0.2 * film.thickness);
        let under = |outline: &Option<Outline>, thickness: f64, word: &str| {
            let film = Film { thickness, ..*film };
            let outline = outline.as_ref();
            let filmed = outline.map(|o| film.applied_within(o, negligible));
            let filmed = filmed.transpose();
            filmed.map_err(|error| Failure::from(error).of(&format!("reach, {word} section")))
        };
        let inner = under(&self.inner, film.thickness + margin, "inner")?;
        let outer = under(&self.outer, film.thickness - margin, "outer")?;
        self.inner = inner.map(|filmed| filmed.outline);
        if let Some(filmed) = outer {
            self.conductance_left_out = filmed.report.conductance_left_out;
            self.outer = Some(filmed.outline);
        }
        Ok(())
    }
}

/// Share of the conductance that a film may leave out.
fn negligible(tolerance: f64) -> f64 {
    NEGLIGIBLE_LUMENS.min(LEFT_OUT_OF_TOLERANCE * tolerance)
}

/// What the section would conduct under the other assumptions that an instrument's file allows, with the film on where
/// there is one.
pub(super) fn alternatives(
    section: &Section,
    film: Option<&Film>,
    flow: &SectionFlow,
    options: &SolveOptions,
) -> Vec<AlternativeRecord> {
    let conductance = |outline: &Option<Outline>| {
        let outline = outline.as_ref().ok_or("it leaves no section")?;
        let (mut outline, _) = outline.clone().without_duplicate_vertices();
        if let Some(film) = film {
            let filmed = film.applied_within(&outline, negligible(options.goal.asked()));
            outline = filmed.map_err(|error| error.to_string())?.outline;
        }
        Ok(under_assumption(&outline, flow.conductance, options))
    };
    let of = |(option, outline): &(String, Option<Outline>)| {
        let found = conductance(outline);
        let relative_change = found.as_ref().ok().and_then(|found| found.relative_change);
        let solved = |found: Assumption| found.conductance.map_err(|error| error.to_string());
        AlternativeRecord {
            option: option.clone(),
            conductance: found.and_then(solved),
            relative_change,
        }
    };
    section.intake.alternatives.iter().map(of).collect()
}
