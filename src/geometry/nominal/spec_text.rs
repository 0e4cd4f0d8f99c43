//! Reads a section from one line: `koh_groove opening=100um depth=40um`; or one value of it.
//!
//! Grammar: `section = kind (name "=" value)*`, `value = word | "(" section ")" | "[" ("(" section ")")* "]"`.
//! A word ends at a blank or a bracket. Commas between the members of a list are allowed.

use std::collections::BTreeMap;
use std::str::FromStr;

use super::spec::DEEPEST_NESTING;
use super::{NominalError, NominalSpec, SpecValue};

impl FromStr for NominalSpec {
    type Err = NominalError;

    fn from_str(text: &str) -> Result<Self, NominalError> {
        let mut reader = Reader {
            text,
            characters: text.chars().collect(),
            next: 0,
        };
        let spec = reader.section(0)?;
        reader.skip_blanks();
        match reader.peek() {
            None => Ok(spec),
            Some(_) => Err(reader.problem("a bracket closes that was not opened")),
        }
    }
}

impl FromStr for SpecValue {
    type Err = NominalError;

    /// Reads a word, a section in round brackets or a list of sections in square brackets.
    fn from_str(text: &str) -> Result<Self, NominalError> {
        let mut reader = Reader {
            text,
            characters: text.chars().collect(),
            next: 0,
        };
        let value = reader.value(0)?;
        reader.skip_blanks();
        match reader.peek() {
            None => Ok(value),
            Some(_) => Err(reader.problem("the value ends here, and more follows")),
        }
    }
}

/// Position in the text.
struct Reader<'a> {
    text: &'a str,
    characters: Vec<char>,
    next: usize,
}

impl Reader<'_> {
    /// A kind and its values, up to the end or a closing bracket.
    fn section(&mut self, nesting: usize) -> Result<NominalSpec, NominalError> {
        if nesting > DEEPEST_NESTING {
            return Err(NominalError::TooDeep {
                limit: DEEPEST_NESTING,
            });
        }
        let kind = self.word("the name of a kind is expected")?;
        let mut values = BTreeMap::new();
        loop {
            self.skip_blanks();
            if matches!(self.peek(), None | Some(')' | ']')) {
                return Ok(NominalSpec { kind, values });
            }
            let start = self.next;
            let name = self.word("the name of a parameter is expected")?;
            self.skip_blanks();
            if self.peek() != Some('=') {
                return Err(self.problem("`=` is expected after the name of a parameter"));
            }
            self.next += 1;
            let value = self.value(nesting)?;
            if values.insert(name, value).is_some() {
                self.next = start;
                return Err(self.problem("this parameter was given before"));
            }
        }
    }

    /// A word, a section in round brackets or a list of sections in square brackets.
    fn value(&mut self, nesting: usize) -> Result<SpecValue, NominalError> {
        self.skip_blanks();
        match self.peek() {
            Some('(') => self.bracketed(nesting).map(SpecValue::Spec),
            Some('[') => {
                self.next += 1;
                let mut members = Vec::new();
                loop {
                    self.skip_blanks();
                    match self.peek() {
                        Some(']') => {
                            self.next += 1;
                            return Ok(SpecValue::List(members));
                        }
                        Some(',') => self.next += 1,
                        Some('(') => members.push(SpecValue::Spec(self.bracketed(nesting)?)),
                        _ => {
                            return Err(
                                self.problem("`(` of a section or `]` is expected in a list")
                            );
                        }
                    }
                }
            }
            _ => self.word("a value is expected").map(SpecValue::Text),
        }
    }

    /// A section in round brackets.
    fn bracketed(&mut self, nesting: usize) -> Result<NominalSpec, NominalError> {
        self.next += 1;
        let spec = self.section(nesting + 1)?;
        self.skip_blanks();
        if self.peek() != Some(')') {
            return Err(self.problem("`)` is expected"));
        }
        self.next += 1;
        Ok(spec)
    }

    /// Characters up to a blank, a bracket or `=`.
    fn word(&mut self, expected: &'static str) -> Result<String, NominalError> {
        self.skip_blanks();
        let mut word = String::new();
        while let Some(c) = self.peek() {
            if c.is_whitespace() || "()[]=,".contains(c) {
                break;
            }
            word.push(c);
            self.next += 1;
        }
        if word.is_empty() {
            return Err(self.problem(expected));
        }
        Ok(word)
    }

    fn skip_blanks(&mut self) {
        while self.peek().is_some_and(char::is_whitespace) {
            self.next += 1;
        }
    }

    fn peek(&self) -> Option<char> {
        self.characters.get(self.next).copied()
    }

    fn problem(&self, problem: &'static str) -> NominalError {
        NominalError::Syntax {
            text: self.text.to_owned(),
            column: self.next + 1,
            problem,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_with_sections_inside_reads_like_tables() {
        let line = "bonded_halves lower=(koh_groove opening=100um depth=40um) \
                    upper=(isotropic_etch mask_opening=50um depth=20um) gap=0um \
                    posts=[(circle diameter=5um x=0um y=-9um), (rectangle width=1um height=2um x=20um y=-9um)]";
        let spec: NominalSpec = line.parse().unwrap();
        assert_eq!(spec.kind, "bonded_halves");
        assert_eq!(spec.values["gap"], SpecValue::Text("0um".to_owned()));
        let SpecValue::Spec(lower) = &spec.values["lower"] else {
            panic!("lower is a section")
        };
        assert_eq!(lower.values["depth"], SpecValue::Text("40um".to_owned()));
        let SpecValue::List(posts) = &spec.values["posts"] else {
            panic!("posts is a list")
        };
        assert_eq!(posts.len(), 2);
    }

    #[test]
    fn one_value_is_a_word_a_section_or_a_list() {
        let value = |text: &str| text.parse::<SpecValue>();
        assert_eq!(value(" 3um "), Ok(SpecValue::Text("3um".to_owned())));
        let circle = SpecValue::Spec("circle diameter=3um".parse().unwrap());
        assert_eq!(value("(circle diameter=3um)"), Ok(circle));
        let list = value("[(circle diameter=3um), (circle diameter=4um)]").unwrap();
        assert!(matches!(list, SpecValue::List(members) if members.len() == 2));
        for wrong in ["", "(circle", "[(circle) ", "3um 4um", "(circle))"] {
            assert!(value(wrong).is_err(), "{wrong}");
        }
    }

    #[test]
    fn a_broken_line_is_refused_with_its_column() {
        for (line, column) in [
            ("", 1),
            ("rectangle width", 16),
            ("rectangle width= height=3um", 24),
            ("rectangle width=3um width=4um", 21),
            ("rectangle width=3um)", 20),
            ("bonded_halves lower=(circle diameter=3um", 41),
            ("rectangle posts=[circle]", 18),
            ("rectangle =3um", 11),
        ] {
            let Err(NominalError::Syntax { column: found, .. }) = line.parse::<NominalSpec>()
            else {
                panic!("`{line}` was read")
            };
            assert_eq!(found, column, "{line}");
        }
        let deep = format!("a {}", "b=(a ".repeat(50_000));
        assert!(matches!(
            deep.parse::<NominalSpec>(),
            Err(NominalError::TooDeep { .. })
        ));
    }
}
