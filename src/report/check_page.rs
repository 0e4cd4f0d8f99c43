//! The page of a check picture: heading, panels, warnings, numbered notes.

use std::fmt::Write as _;

use super::check_curves::draw_curves;
use super::check_image::draw_image;
use super::check_map::draw_map;
use super::check_picture::{CheckPicture, CurvePanel, Panel};
use super::drawing::{Anchor, Colour, Drawing, Item, TextSize};
use super::numbers;
use super::picture::{MARGIN, PictureError, PictureFormat, broken};
use super::png::to_png;
use super::svg::to_svg;
use crate::geometry::Point;

/// Width between the borders, px.
const INNER: f64 = 1120.0;
/// Gap between panels side by side, px.
const GUTTER: f64 = 24.0;
/// Most panels on a page.
const MOST_PANELS: usize = 40;
/// Most notes and most warnings on a page.
const MOST_NOTES: usize = 120;
/// Longest note, characters.
const LONGEST_NOTE: usize = 1_200;
/// Longest description of the file, characters.
const LONGEST_DESCRIPTION: usize = 12_000;
/// Lines between parts of the page.
const RULE: Colour = [150, 150, 150];
/// Mark of a warning.
const ALARM: Colour = [176, 48, 0];

/// Where a panel stands and how far the page is filled.
#[derive(Debug, Clone, Copy)]
pub(super) struct Frame {
    pub(super) left: f64,
    pub(super) width: f64,
    /// Px from the top.
    pub(super) y: f64,
}

impl Frame {
    /// Writes a paragraph and moves down.
    pub(super) fn paragraph(&mut self, drawing: &mut Drawing, text: &str, size: TextSize) {
        self.hanging(drawing, text, size, 0.0);
    }

    /// The same with an indent.
    fn hanging(&mut self, drawing: &mut Drawing, text: &str, size: TextSize, indent: f64) {
        let room = ((self.width - indent) / size.advance()).floor() as usize;
        for line in broken(text, room) {
            self.y += size.line_height();
            let at = [self.left + indent, self.y - 5.0];
            drawing.text(at, Anchor::Start, size, line);
        }
    }
}

/// The check picture as the bytes of a file.
///
/// # Errors
/// [`PictureError`] when there is nothing to draw or the encoder refuses.
///
/// # Examples
/// See [`CheckPicture`].
pub fn check_picture_bytes(
    picture: &CheckPicture,
    format: PictureFormat,
) -> Result<Vec<u8>, PictureError> {
    let drawing = draw_check(picture)?;
    Ok(match format {
        PictureFormat::Png => to_png(&drawing)?,
        PictureFormat::Svg => to_svg(&drawing)?.into_bytes(),
    })
}

/// The check picture as a drawing.
///
/// A panel that cannot be drawn says so in its place. Of more than 40 panels, 120 notes or 120 warnings the first
/// are shown and the others counted.
///
/// # Errors
/// [`PictureError::EmptyCheck`] when no panel can be drawn.
pub fn draw_check(picture: &CheckPicture) -> Result<Drawing, PictureError> {
    let mut drawing = Drawing {
        width: (INNER + 2.0 * MARGIN) as u32,
        height: 0,
        title: format!("check picture: {}", numbers::title(&picture.title)),
        description: String::new(),
        items: Vec::new(),
    };
    let mut page = Frame {
        left: MARGIN,
        width: INNER,
        y: MARGIN,
    };
    heading(&mut drawing, &mut page, picture);
    let failures = panels(&mut drawing, &mut page, &picture.panels);
    if failures.len() == picture.panels.len() {
        let reason = if failures.is_empty() {
            "there is no panel".to_owned()
        } else {
            failures.join("; ")
        };
        return Err(PictureError::EmptyCheck { reason });
    }
    list(&mut drawing, &mut page, "Warnings", &picture.warnings);
    list(&mut drawing, &mut page, "What was done", &picture.notes);
    if drawing.description.chars().count() > LONGEST_DESCRIPTION {
        drawing.description = cut(&drawing.description, LONGEST_DESCRIPTION);
    }
    drawing.height = (page.y + MARGIN).ceil() as u32;
    Ok(drawing)
}

fn heading(drawing: &mut Drawing, page: &mut Frame, picture: &CheckPicture) {
    let title = numbers::title(&picture.title);
    page.paragraph(drawing, &title, TextSize::Large);
    page.y += 4.0;
    let plural = |n: usize, what: &str| match n {
        1 => format!("1 {what}"),
        n => format!("{n} {what}s"),
    };
    let mut words = format!(
        "Check picture: from the instrument's file to the section in {}",
        plural(picture.panels.len(), "panel"),
    );
    if !picture.notes.is_empty() {
        let _ = write!(words, " and {}", plural(picture.notes.len(), "note"));
    }
    let warnings = picture.warnings.len();
    if warnings > 0 {
        let _ = write!(words, "; {} below", plural(warnings, "warning"));
    }
    drawing.description = format!("{words}.");
    page.paragraph(drawing, &words, TextSize::Medium);
    page.y += 14.0;
}

/// Draws the panels; returns why some could not be drawn.
fn panels(drawing: &mut Drawing, page: &mut Frame, panels: &[Panel]) -> Vec<String> {
    let is_half = |p: Option<&Panel>| {
        matches!(
            p,
            Some(Panel::Curves(CurvePanel {
                half_width: true,
                ..
            }))
        )
    };
    let mut failures = Vec::new();
    let shown = panels.len().min(MOST_PANELS);
    let mut index = 0;
    while index < shown {
        let is_pair = is_half(panels.get(index)) && is_half(panels.get(index + 1));
        let columns = if is_pair && index + 1 < shown { 2 } else { 1 };
        rule(drawing, page);
        let width = (INNER - GUTTER * (columns - 1) as f64) / columns as f64;
        let mut deepest = page.y;
        for column in 0..columns {
            let mut frame = Frame {
                left: page.left + (width + GUTTER) * column as f64,
                width,
                y: page.y,
            };
            if let Some(panel) = panels.get(index + column) {
                failures.extend(one_panel(drawing, &mut frame, index + column, panel));
            }
            deepest = deepest.max(frame.y);
        }
        page.y = deepest + 16.0;
        index += columns;
    }
    if panels.len() > shown {
        let words = format!("{} more panels are not shown.", panels.len() - shown);
        let _ = write!(drawing.description, " {words}");
        page.paragraph(drawing, &words, TextSize::Medium);
    }
    failures
}

/// Draws one panel with its heading; returns why it could not be drawn.
fn one_panel(
    drawing: &mut Drawing,
    frame: &mut Frame,
    index: usize,
    panel: &Panel,
) -> Option<String> {
    let title = match panel {
        Panel::Curves(p) => &p.title,
        Panel::Image(p) => &p.title,
        Panel::Map(p) => &p.title,
    };
    let letter = char::from(b'A' + (index % 26) as u8);
    let turn = if index >= 26 { "A" } else { "" };
    let title = format!("{turn}{letter}: {}", numbers::title(title));
    let _ = write!(drawing.description, " Panel {title}.");
    frame.paragraph(drawing, &title, TextSize::Medium);
    frame.y += 2.0;
    let begun = drawing.items.len();
    let drawn = match panel {
        Panel::Curves(p) => draw_curves(drawing, frame, p),
        Panel::Image(p) => draw_image(drawing, frame, p),
        Panel::Map(p) => draw_map(drawing, frame, p),
    };
    let reason = drawn.err()?;
    drawing.items.truncate(begun);
    let words = format!("Nothing to draw: {reason}.");
    let _ = write!(drawing.description, " {words}");
    frame.paragraph(drawing, &words, TextSize::Small);
    Some(format!("panel {turn}{letter}: {reason}"))
}

fn rule(drawing: &mut Drawing, page: &mut Frame) {
    let right = page.left + page.width;
    drawing.lines(vec![vec![[page.left, page.y], [right, page.y]]], RULE, 1.0);
    page.y += 8.0;
}

/// A list below the panels: warnings with a mark, anything else numbered.
fn list(drawing: &mut Drawing, page: &mut Frame, name: &str, texts: &[String]) {
    if texts.is_empty() {
        return;
    }
    rule(drawing, page);
    let is_alarm = name == "Warnings";
    page.paragraph(drawing, name, TextSize::Medium);
    page.y += 4.0;
    let _ = write!(drawing.description, " {name}:");
    let size = TextSize::Medium;
    let digits = texts.len().min(MOST_NOTES).to_string().len();
    let indent = if is_alarm {
        30.0
    } else {
        size.advance() * (digits + 2) as f64
    };
    for (index, text) in texts.iter().take(MOST_NOTES).enumerate() {
        let text = cut(&numbers::one_line(text), LONGEST_NOTE);
        let at = [page.left, page.y + size.line_height() - 5.0];
        if is_alarm {
            alarm(drawing, [at[0] + 9.0, at[1]]);
        } else {
            let end = [page.left + size.advance() * (digits + 1) as f64, at[1]];
            drawing.text(end, Anchor::End, size, format!("{}.", index + 1));
        }
        let top = page.y;
        page.hanging(drawing, &text, size, indent);
        page.y = page.y.max(top + size.line_height()) + 3.0;
        let _ = write!(drawing.description, " {}. {text}", index + 1);
    }
    if texts.len() > MOST_NOTES {
        let words = format!("... and {} more, not shown.", texts.len() - MOST_NOTES);
        page.hanging(drawing, &words, size, indent);
    }
    page.y += 12.0;
}

/// A triangle with an exclamation mark, standing on `foot`.
fn alarm(drawing: &mut Drawing, [x, y]: Point) {
    let corners = vec![[x, y - 14.0], [x + 9.0, y + 2.0], [x - 9.0, y + 2.0]];
    drawing.items.push(Item::Area {
        loops: vec![corners],
        fill: ALARM,
    });
    let strokes = vec![
        vec![[x, y - 8.5], [x, y - 4.0]],
        vec![[x, y - 0.6], [x, y - 0.5]],
    ];
    drawing.lines(strokes, [255, 255, 255], 2.0);
}

/// A text cut where it is very long.
fn cut(text: &str, longest: usize) -> String {
    let mut text = text.to_owned();
    if let Some((at, _)) = text.char_indices().nth(longest) {
        text.truncate(at);
        text.push_str(" ...");
    }
    text
}
