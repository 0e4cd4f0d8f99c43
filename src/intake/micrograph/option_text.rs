//! The texts of the options on the command line: `--threshold 45%`, `--denoise gauss:1.5`, `--region 10,20`.

use std::str::FromStr;

use super::micrograph_problem::MicrographProblem;
use super::options::{Channel, Denoise, PixelBox, Region, Threshold, Tilt, Tone};
use crate::units::parse_angle;

/// Radius of the square about a stated point whose median is taken, pixels.
const POINT_RADIUS: u32 = 2;

fn wrong(option: &'static str, text: &str, forms: &'static str) -> MicrographProblem {
    MicrographProblem::OptionText {
        option,
        text: text.to_owned(),
        forms,
    }
}

/// Whole numbers between commas.
fn numbers(text: &str) -> Option<Vec<u32>> {
    text.split(',')
        .map(|part| part.trim().parse().ok())
        .collect()
}

/// A finite number.
fn number(text: &str) -> Option<f64> {
    text.trim().parse().ok().filter(|v: &f64| v.is_finite())
}

impl FromStr for Tilt {
    type Err = MicrographProblem;

    /// `70deg` for the tilt of the stage, `face:20deg` for the turn of the face.
    fn from_str(text: &str) -> Result<Self, Self::Err> {
        let (make, angle): (fn(f64) -> Self, &str) = match text.split_once(':') {
            Some(("face", angle)) => (Self::Face, angle),
            Some(("stage", angle)) => (Self::Stage, angle),
            _ => (Self::Stage, text),
        };
        parse_angle(angle)
            .map(make)
            .map_err(|_| wrong("--tilt", text, "70deg, stage:70deg or face:20deg"))
    }
}

impl FromStr for Channel {
    type Err = MicrographProblem;

    fn from_str(text: &str) -> Result<Self, Self::Err> {
        match text {
            "grey" | "gray" => Ok(Self::Grey),
            "red" => Ok(Self::Red),
            "green" => Ok(Self::Green),
            "blue" => Ok(Self::Blue),
            _ => Err(wrong("--channel", text, "grey, red, green or blue")),
        }
    }
}

impl FromStr for Tone {
    type Err = MicrographProblem;

    fn from_str(text: &str) -> Result<Self, Self::Err> {
        match text {
            "dark" => Ok(Self::Dark),
            "bright" => Ok(Self::Bright),
            _ => Err(wrong("--fluid-is", text, "dark or bright")),
        }
    }
}

/// A point `X,Y`, taken as the square about it, or a patch `X,Y,WIDTH,HEIGHT`.
fn patch(text: &str) -> Option<PixelBox> {
    match *numbers(text)?.as_slice() {
        [x, y] => Some(PixelBox {
            x: x.saturating_sub(POINT_RADIUS),
            y: y.saturating_sub(POINT_RADIUS),
            width: 2 * POINT_RADIUS + 1,
            height: 2 * POINT_RADIUS + 1,
        }),
        [x, y, width, height] if width > 0 && height > 0 => Some(PixelBox {
            x,
            y,
            width,
            height,
        }),
        _ => None,
    }
}

impl FromStr for Threshold {
    type Err = MicrographProblem;

    /// `otsu`, a grey value, a share of full scale such as `45%`, or two points or patches `X1,Y1:X2,Y2`, the
    /// first in the fluid and the second in the wall.
    fn from_str(text: &str) -> Result<Self, Self::Err> {
        let forms =
            "otsu, a grey value such as 112, a share such as 45%, or FLUID_X,FLUID_Y:WALL_X,WALL_Y";
        let read = || {
            if text == "otsu" {
                return Some(Self::Otsu);
            }
            if let Some((fluid, wall)) = text.split_once(':') {
                return Some(Self::Walls(patch(fluid)?, patch(wall)?));
            }
            if let Some(share) = text.strip_suffix('%') {
                let share = number(share)? / 100.0;
                return (0.0..=1.0).contains(&share).then_some(Self::Share(share));
            }
            number(text).map(Self::Value)
        };
        read().ok_or_else(|| wrong("--threshold", text, forms))
    }
}

impl FromStr for Denoise {
    type Err = MicrographProblem;

    /// `none`, `median:RADIUS` or `gauss:SIGMA`, both in pixels.
    fn from_str(text: &str) -> Result<Self, Self::Err> {
        let read = || match text.split_once(':') {
            None if text == "none" => Some(Self::None),
            Some(("median", radius)) => radius.trim().parse().ok().map(Self::Median),
            Some(("gauss", sigma)) => number(sigma).map(Self::Gaussian),
            _ => None,
        };
        let denoise = read().filter(|denoise| denoise.is_in_range());
        denoise.ok_or_else(|| {
            wrong(
                "--denoise",
                text,
                "none, median:RADIUS with 1 to 10 pixels, or gauss:SIGMA with up to 20 pixels",
            )
        })
    }
}

impl FromStr for Region {
    type Err = MicrographProblem;

    /// `largest`, a pixel `X,Y` or a number of the list.
    fn from_str(text: &str) -> Result<Self, Self::Err> {
        let forms = "largest, a pixel X,Y in the section, or a number of the list";
        let read = || {
            if text == "largest" {
                return Some(Self::Largest);
            }
            match *numbers(text)?.as_slice() {
                [x, y] => Some(Self::Seed(x, y)),
                [n] if n > 0 => Some(Self::Number(n as usize)),
                _ => None,
            }
        };
        read().ok_or_else(|| wrong("--region", text, forms))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn texts_of_the_options_are_read() {
        assert_eq!("otsu".parse(), Ok(Threshold::Otsu));
        assert_eq!("112.5".parse(), Ok(Threshold::Value(112.5)));
        assert_eq!("45%".parse(), Ok(Threshold::Share(0.45)));
        let Ok(Threshold::Walls(fluid, wall)) = "10,20:1,0,4,5".parse() else {
            panic!("no patches");
        };
        assert_eq!((fluid.x, fluid.y, fluid.width), (8, 18, 5));
        assert_eq!((wall.x, wall.y, wall.width, wall.height), (1, 0, 4, 5));
        assert_eq!("median:1".parse(), Ok(Denoise::Median(1)));
        assert_eq!("gauss:1.5".parse(), Ok(Denoise::Gaussian(1.5)));
        assert_eq!("10,20".parse(), Ok(Region::Seed(10, 20)));
        assert_eq!("2".parse(), Ok(Region::Number(2)));
        assert_eq!("largest".parse(), Ok(Region::Largest));
        assert_eq!("bright".parse(), Ok(Tone::Bright));
        assert_eq!("green".parse(), Ok(Channel::Green));
        let Ok(Tilt::Face(angle)) = "face:20deg".parse() else {
            panic!("no angle");
        };
        assert!((angle - 20_f64.to_radians()).abs() < 1e-12);
        assert!(matches!("70deg".parse(), Ok(Tilt::Stage(_))));
    }

    #[test]
    fn wrong_texts_name_their_option_and_its_forms() {
        for text in ["", "otsu ", "nan", "120%", "1,2", "1,2:3", "1,2:3,4,0,1"] {
            let problem = text.parse::<Threshold>().unwrap_err();
            assert!(problem.to_string().contains("--threshold"), "{problem}");
        }
        for text in [
            "median:0",
            "median:11",
            "gauss:0",
            "gauss:21",
            "mean:1",
            "gauss:nan",
        ] {
            assert!(text.parse::<Denoise>().is_err(), "{text}");
        }
        for text in ["0", "-1", "1,2,3", "x"] {
            assert!(text.parse::<Region>().is_err(), "{text}");
        }
        assert!("70".parse::<Tilt>().is_err());
        assert!("grau".parse::<Channel>().is_err());
        assert!("grey".parse::<Tone>().is_err());
    }
}
