//! The path data of an SVG drawing as closed pieces of lines, Bezier curves and elliptic arcs.
//!
//! Arcs are kept as arcs of the exact ellipse (SVG 1.1, appendix F.6.5: from end points to centre), in
//! double precision. The general readers replace an arc by cubics that are 2.7e-4 of its radius too large
//! at worst, which would put 5e-4 on the conductance of a circle.

use crate::geometry::Point;

/// One piece of a wall; it begins where the piece before ends.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Piece {
    Line(Point),
    Quadratic(Point, Point),
    Cubic(Point, Point, Point),
    Arc(Arc, Point),
}

/// An arc of an ellipse: `centre + cos(t) u + sin(t) v` for `t` from `start` over `sweep`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Arc {
    pub(crate) centre: Point,
    pub(crate) u: Point,
    pub(crate) v: Point,
    pub(crate) start: f64,
    pub(crate) sweep: f64,
}

/// One closed run of pieces.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct SubPath {
    pub(crate) start: Point,
    pub(crate) pieces: Vec<Piece>,
}

/// Reads characters and numbers of SVG attributes.
#[derive(Debug, Clone)]
pub(crate) struct Scanner<'a> {
    text: &'a str,
    at: usize,
}

impl<'a> Scanner<'a> {
    pub(crate) fn new(text: &'a str) -> Self {
        Self { text, at: 0 }
    }

    pub(crate) fn offset(&self) -> usize {
        self.at
    }

    pub(crate) fn is_done(&self) -> bool {
        self.at >= self.text.len()
    }

    fn peek(&self) -> Option<u8> {
        self.text.as_bytes().get(self.at).copied()
    }

    /// White space and commas.
    pub(crate) fn skip_separators(&mut self) {
        while matches!(
            self.peek(),
            Some(b' ' | b'\t' | b'\n' | b'\r' | 0x0c | b',')
        ) {
            self.at += 1;
        }
    }

    pub(crate) fn take(&mut self, wanted: u8) -> bool {
        let found = self.peek() == Some(wanted);
        self.at += usize::from(found);
        found
    }

    /// A run of letters.
    pub(crate) fn word(&mut self) -> &'a str {
        let start = self.at;
        while self.peek().is_some_and(|b| b.is_ascii_alphabetic()) {
            self.at += 1;
        }
        self.text.get(start..self.at).unwrap_or_default()
    }

    fn digits(&mut self) -> bool {
        let start = self.at;
        while self.peek().is_some_and(|b| b.is_ascii_digit()) {
            self.at += 1;
        }
        self.at > start
    }

    /// A finite number; on failure the scanner stays where it was.
    pub(crate) fn number(&mut self) -> Option<f64> {
        let start = self.at;
        if matches!(self.peek(), Some(b'+' | b'-')) {
            self.at += 1;
        }
        let whole = self.digits();
        let part = self.take(b'.') && self.digits();
        if whole || part {
            let before_exponent = self.at;
            if matches!(self.peek(), Some(b'e' | b'E')) {
                self.at += 1;
                if matches!(self.peek(), Some(b'+' | b'-')) {
                    self.at += 1;
                }
                if !self.digits() {
                    self.at = before_exponent;
                }
            }
        }
        let value = self.text.get(start..self.at).and_then(|t| t.parse().ok());
        let value = value.filter(|v: &f64| v.is_finite() && (whole || part));
        if value.is_none() {
            self.at = start;
        }
        value
    }

    fn next_number(&mut self) -> Option<f64> {
        self.skip_separators();
        self.number()
    }

    fn next_flag(&mut self) -> Option<bool> {
        self.skip_separators();
        if self.take(b'0') {
            return Some(false);
        }
        self.take(b'1').then_some(true)
    }
}

/// Reads path data; an error is the byte offset where reading stopped.
pub(crate) fn parse(data: &str) -> Result<Vec<SubPath>, usize> {
    let mut reader = PathReader {
        scanner: Scanner::new(data),
        paths: Vec::new(),
        current: [0.0; 2],
        start: [0.0; 2],
        control: None,
        is_open: false,
    };
    reader.run().ok_or(reader.scanner.offset())?;
    Ok(reader.paths)
}

/// The control point of the curve before, for smooth curves.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Control {
    Quadratic(Point),
    Cubic(Point),
}

struct PathReader<'a> {
    scanner: Scanner<'a>,
    paths: Vec<SubPath>,
    current: Point,
    start: Point,
    control: Option<Control>,
    is_open: bool,
}

impl PathReader<'_> {
    fn run(&mut self) -> Option<()> {
        let mut first = true;
        loop {
            self.scanner.skip_separators();
            let Some(letter) = self.scanner.peek() else {
                return Some(());
            };
            if !letter.is_ascii_alphabetic() || (first && !matches!(letter, b'M' | b'm')) {
                return None;
            }
            first = false;
            self.scanner.at += 1;
            let relative = letter.is_ascii_lowercase();
            let mut command = letter.to_ascii_uppercase();
            loop {
                self.command(command, relative)?;
                self.scanner.skip_separators();
                let more = matches!(self.scanner.peek(), Some(b'0'..=b'9' | b'.' | b'+' | b'-'));
                if !more {
                    break;
                }
                command = match command {
                    b'M' => b'L',
                    b'Z' => return None,
                    other => other,
                };
            }
        }
    }

    fn point(&mut self, relative: bool) -> Option<Point> {
        let (x, y) = (self.scanner.next_number()?, self.scanner.next_number()?);
        Some(if relative {
            [self.current[0] + x, self.current[1] + y]
        } else {
            [x, y]
        })
    }

    fn push(&mut self, piece: Piece, end: Point) {
        if !self.is_open {
            self.paths.push(SubPath {
                start: self.start,
                pieces: Vec::new(),
            });
            self.is_open = true;
        }
        if let Some(path) = self.paths.last_mut() {
            path.pieces.push(piece);
        }
        self.current = end;
    }

    fn command(&mut self, command: u8, relative: bool) -> Option<()> {
        let control = self.control.take();
        match command {
            b'M' => {
                self.start = self.point(relative)?;
                self.current = self.start;
                self.is_open = false;
            }
            b'Z' => {
                self.current = self.start;
                self.is_open = false;
            }
            b'L' => {
                let end = self.point(relative)?;
                self.push(Piece::Line(end), end);
            }
            b'H' | b'V' => {
                let along = usize::from(command == b'V');
                let mut end = self.current;
                let value = self.scanner.next_number()?;
                end[along] = if relative { end[along] + value } else { value };
                self.push(Piece::Line(end), end);
            }
            b'A' => self.arc(relative)?,
            _ => self.curve(command, relative, control)?,
        }
        Some(())
    }

    fn curve(&mut self, command: u8, relative: bool, control: Option<Control>) -> Option<()> {
        let mirror = |p: Point| [2.0 * self.current[0] - p[0], 2.0 * self.current[1] - p[1]];
        let smooth = match (command, control) {
            (b'T', Some(Control::Quadratic(p))) | (b'S', Some(Control::Cubic(p))) => mirror(p),
            _ => self.current,
        };
        match command {
            b'C' | b'S' => {
                let first = if command == b'C' {
                    self.point(relative)?
                } else {
                    smooth
                };
                let (second, end) = (self.point(relative)?, self.point(relative)?);
                self.push(Piece::Cubic(first, second, end), end);
                self.control = Some(Control::Cubic(second));
            }
            b'Q' | b'T' => {
                let middle = if command == b'Q' {
                    self.point(relative)?
                } else {
                    smooth
                };
                let end = self.point(relative)?;
                self.push(Piece::Quadratic(middle, end), end);
                self.control = Some(Control::Quadratic(middle));
            }
            _ => return None,
        }
        Some(())
    }

    fn arc(&mut self, relative: bool) -> Option<()> {
        let radii = [self.scanner.next_number()?, self.scanner.next_number()?];
        let turn = self.scanner.next_number()?;
        let (large, positive) = (self.scanner.next_flag()?, self.scanner.next_flag()?);
        let end = self.point(relative)?;
        if end.map(f64::to_bits) == self.current.map(f64::to_bits) {
            return Some(());
        }
        let piece = match arc_between(self.current, end, radii, turn, (large, positive)) {
            Some(arc) => Piece::Arc(arc, end),
            None => Piece::Line(end),
        };
        self.push(piece, end);
        Some(())
    }
}

/// The arc of an ellipse between two points; `None` when a radius is zero.
///
/// # Source
/// W3C (2011), Scalable Vector Graphics 1.1, second edition, appendix F.6.5 and F.6.6 (from memory).
fn arc_between(
    from: Point,
    to: Point,
    radii: [f64; 2],
    degrees: f64,
    (large, positive): (bool, bool),
) -> Option<Arc> {
    let [mut rx, mut ry] = radii.map(f64::abs);
    if rx == 0.0 || ry == 0.0 {
        return None;
    }
    let (sin, cos) = degrees.to_radians().sin_cos();
    let half = [(from[0] - to[0]) / 2.0, (from[1] - to[1]) / 2.0];
    let x = cos * half[0] + sin * half[1];
    let y = cos * half[1] - sin * half[0];
    let reach = (x / rx).hypot(y / ry);
    if reach > 1.0 {
        rx *= reach;
        ry *= reach;
    }
    let (px, py) = (x / rx, y / ry);
    let square = px * px + py * py;
    let size = ((1.0 - square).max(0.0) / square).sqrt();
    let size = if large == positive { -size } else { size };
    let (cx, cy) = (size * py, -size * px);
    let start = (py - cy).atan2(px - cx);
    let stop = (-py - cy).atan2(-px - cx);
    let full = std::f64::consts::TAU;
    let mut sweep = stop - start;
    if positive && sweep < 0.0 {
        sweep += full;
    } else if !positive && sweep > 0.0 {
        sweep -= full;
    }
    let (u, v) = ([rx * cos, rx * sin], [-ry * sin, ry * cos]);
    let centre = [
        f64::midpoint(from[0], to[0]) + cx * u[0] + cy * v[0],
        f64::midpoint(from[1], to[1]) + cx * u[1] + cy * v[1],
    ];
    Some(Arc {
        centre,
        u,
        v,
        start,
        sweep,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn commands_absolute_relative_and_repeated() {
        let paths = parse("M0,0 10 0 10-5zm1 1h2v3H0V0 Z").unwrap();
        assert_eq!(paths.len(), 2);
        assert_eq!(
            paths[0].pieces,
            [Piece::Line([10.0, 0.0]), Piece::Line([10.0, -5.0])]
        );
        assert!(paths[1].start[0] > 0.999 && paths[1].start[1] < 1.001);
        assert_eq!(paths[1].pieces[1], Piece::Line([3.0, 4.0]));
        let smooth = parse("M0 0C0 1 1 1 1 0S2-1 2 0Q3 1 4 0T6 0").unwrap();
        assert_eq!(
            smooth[0].pieces[1],
            Piece::Cubic([1.0, -1.0], [2.0, -1.0], [2.0, 0.0])
        );
        assert_eq!(
            smooth[0].pieces[3],
            Piece::Quadratic([5.0, -1.0], [6.0, 0.0])
        );
    }

    #[test]
    fn an_arc_lies_on_its_ellipse() {
        let paths = parse("M10 0a10 5 0 01-20 0").unwrap();
        let Piece::Arc(arc, end) = paths[0].pieces[0] else {
            panic!("an arc");
        };
        assert!((end[0] + 10.0).abs() < 1e-12 && end[1].abs() < 1e-12);
        assert!(arc.centre[0].abs() < 1e-12 && arc.centre[1].abs() < 1e-12);
        assert!((arc.sweep - std::f64::consts::PI).abs() < 1e-12);
        let point = |t: f64| {
            let (sin, cos) = t.sin_cos();
            [
                arc.centre[0] + cos * arc.u[0] + sin * arc.v[0],
                arc.centre[1] + cos * arc.u[1] + sin * arc.v[1],
            ]
        };
        let middle = point(arc.start + arc.sweep / 2.0);
        assert!(
            (middle[1] - 5.0).abs() < 1e-12,
            "positive sweep turns from x to y"
        );
        let first = point(arc.start);
        assert!((first[0] - 10.0).abs() < 1e-12);
    }

    #[test]
    fn broken_data_says_where() {
        assert_eq!(parse("M0 0L1"), Err(6));
        assert_eq!(parse("L1 1"), Err(0));
        assert_eq!(parse("M0 0 K"), Err(6));
        assert!(parse("M0 0 Z 5").is_err());
        assert!(parse("M1e999 0").is_err());
        assert_eq!(parse(""), Ok(Vec::new()));
    }
}
