//! Defects of a file that was read all the same, each by name.

use crate::intake::step::Step;
use crate::warning::{Code, Warning};

/// Most defects of a file that are told one by one.
const TOLD: usize = 20;

/// Defects of a file: what is wrong and how it was read.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct FileDefects {
    /// Sentences.
    texts: Vec<String>,
    /// Defects beyond those told.
    more: usize,
}

impl FileDefects {
    /// Notes a defect.
    pub(super) fn note(&mut self, text: impl Into<String>) {
        if self.texts.len() < TOLD {
            self.texts.push(text.into());
        } else {
            self.more += 1;
        }
    }

    /// A step and a warning for each defect.
    pub(super) fn tell(mut self, steps: &mut Vec<Step>, warnings: &mut Vec<Warning>) {
        if self.more > 0 {
            self.texts.push(format!("{} more defects", self.more));
        }
        for text in self.texts {
            steps.push(Step::new("file_defect", text.clone()));
            warnings.push(Warning {
                code: Code::FileDefect,
                message: text,
                advice: "export the file again if its origin is in doubt".to_owned(),
                numbers: Vec::new(),
            });
        }
    }
}
