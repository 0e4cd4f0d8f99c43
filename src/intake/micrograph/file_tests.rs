//! TIFF files made in memory: tags with scales, tilt and data bars, palettes, pages and kinds of samples.

use std::io::Cursor;

use tiff::encoder::colortype::{self, ColorType};
use tiff::encoder::{Rational, TiffEncoder, TiffValue};
use tiff::tags::Tag;

use super::test_pictures::{Drawn, micrometre};
use super::*;
use crate::warning::Code;

/// A dark disc of radius 15 in 50 x 50 pixels, 8 bits.
fn disc() -> Vec<u8> {
    let drawn = Drawn::disc(50, [25.2, 24.9], 15.0);
    drawn
        .wall
        .iter()
        .map(|w| (40.0 + 160.0 * w) as u8)
        .collect()
}

/// A file of one 8-bit page with further tags.
fn file_of(tags: &[(u16, &str)], resolution: Option<(u16, u32, u32)>) -> Vec<u8> {
    let mut bytes = Cursor::new(Vec::new());
    let mut encoder = TiffEncoder::new(&mut bytes).unwrap();
    let mut image = encoder.new_image::<colortype::Gray8>(50, 50).unwrap();
    for &(tag, text) in tags {
        image.encoder().write_tag(Tag::Unknown(tag), text).unwrap();
    }
    if let Some((unit, above, below)) = resolution {
        let value = Rational { n: above, d: below };
        let write = |image: &mut tiff::encoder::ImageEncoder<'_, _, colortype::Gray8, _>| {
            image.encoder().write_tag(
                Tag::XResolution,
                Rational {
                    n: value.n,
                    d: value.d,
                },
            )?;
            image.encoder().write_tag(
                Tag::YResolution,
                Rational {
                    n: value.n,
                    d: value.d,
                },
            )?;
            image.encoder().write_tag(Tag::ResolutionUnit, unit)
        };
        write(&mut image).unwrap();
    }
    image.write_data(&disc()).unwrap();
    bytes.into_inner()
}

fn read(bytes: &[u8]) -> Result<MicrographSection, MicrographProblem> {
    read_micrograph(bytes, &MicrographOptions::default())
}

/// Pixel size that was used, m.
fn used(bytes: &[u8]) -> f64 {
    let section = read(bytes).unwrap();
    let used = section.scale_candidates.iter().filter(|c| c.used).count();
    assert_eq!(used, 1);
    section.metres_per_pixel[0]
}

fn is_near(a: f64, b: f64) -> bool {
    (a / b - 1.0).abs() < 1e-9
}

#[test]
fn scales_are_read_from_their_tags() {
    let private = "[Scan]\r\nPixelWidth=2e-07\r\nPixelHeight=2e-07\r\nHorFieldsize=1e-05\r\n";
    assert!(is_near(used(&file_of(&[(34682, private)], None)), 2e-7));
    let keys = "AP_PIXEL_SIZE\r\nPixel Size = 50.00 nm\r\nAP_IMAGE_PIXEL_SIZE\r\nImage Pixel Size = 25.00 nm\r\n";
    assert!(is_near(used(&file_of(&[(34118, keys)], None)), 25e-9));
    let ome = "<?xml version=\"1.0\"?><OME><Image><Pixels SizeX=\"50\" PhysicalSizeX=\"0.3\" \
               PhysicalSizeXUnit=\"um\" PhysicalSizeY=\"0.3\"/></Image></OME>";
    assert!(is_near(used(&file_of(&[(270, ome)], None)), 0.3e-6));
    let unit = file_of(&[(270, "unit=micron\nmin=0\n")], Some((1, 8, 1)));
    assert!(is_near(used(&unit), 0.125e-6));
    assert!(is_near(used(&file_of(&[], Some((3, 40_000, 1)))), 0.25e-6));
    let one = read(&unit).unwrap();
    assert!(one.warnings.iter().any(|w| w.code == Code::ScaleUnsure));
}

#[test]
fn what_is_no_scale_is_listed_with_its_reason() {
    let ome = "<OME><Pixels PhysicalSizeX=\"0.3\" PhysicalSizeXUnit=\"pixel\"/></OME>";
    for (bytes, text) in [
        (file_of(&[], Some((2, 72, 1))), "72 dpi is for screens"),
        (file_of(&[], Some((2, 300, 1))), "300 dpi is for screens"),
        (file_of(&[], Some((2, 64, 1))), "too large for a micrograph"),
        (
            file_of(&[(270, "unit=pixel\n")], Some((1, 1, 1))),
            "no length",
        ),
        (file_of(&[(270, ome)], None), "no length"),
        (file_of(&[(270, "<OME><Pixels")], None), "no scale"),
        (file_of(&[], None), "no scale"),
    ] {
        let found = read(&bytes).unwrap_err();
        assert!(
            found.is_ambiguous() && found.to_string().contains(text),
            "{found}"
        );
        assert!(found.hint().contains("--scale"));
    }
}

#[test]
fn scales_that_differ_stop_until_one_is_typed() {
    // The pixel size is that of a picture twice as large as the one stored.
    let keys = "AP_PIXEL_SIZE\r\nPixel Size = 50.00 nm\r\nAP_WIDTH\r\nWidth = 5.0 um\r\n";
    let bytes = file_of(&[(34118, keys)], None);
    let found = read(&bytes).unwrap_err();
    assert!(matches!(found, MicrographProblem::ScaleConflict { .. }) && found.is_ambiguous());
    assert!(found.to_string().contains("AP_WIDTH"), "{found}");
    let typed = MicrographOptions {
        scale: Some(100e-9),
        ..MicrographOptions::default()
    };
    let section = read_micrograph(&bytes, &typed).unwrap();
    assert_eq!(section.scale_candidates.len(), 3);
    assert!(section.scale_candidates[0].used);
    assert!(section.warnings.iter().any(|w| w.code == Code::ScaleUnsure));
    let unequal = file_of(
        &[(34682, "[Scan]\nPixelWidth=1e-7\nPixelHeight=2e-7\n")],
        None,
    );
    assert!(read(&unequal).is_ok());
    let found = read_micrograph(&unequal, &typed).unwrap_err();
    assert!(matches!(found, MicrographProblem::NotSquare { .. }));
}

#[test]
fn a_tilt_is_refused_until_it_is_dealt_with() {
    let text = "[Scan]\nPixelWidth=1e-7\nPixelHeight=1e-7\n[Stage]\nStageT=0.9\n";
    let bytes = file_of(&[(34682, text)], None);
    let found = read(&bytes).unwrap_err();
    assert!(matches!(found, MicrographProblem::Tilted { .. }) && found.is_ambiguous());
    let height = |tilt| {
        let options = MicrographOptions {
            tilt: Some(tilt),
            ..MicrographOptions::default()
        };
        read_micrograph(&bytes, &options).unwrap().metres_per_pixel[1]
    };
    assert!(is_near(height(Tilt::Stage(0.9)), 1e-7 / 0.9_f64.sin()));
    assert!(is_near(height(Tilt::Face(0.9)), 1e-7 / 0.9_f64.cos()));
    assert!(is_near(height(Tilt::Corrected), 1e-7));
    let level = file_of(
        &[(34682, "[Scan]\nPixelWidth=1e-7\n[Stage]\nStageT=6e-6\n")],
        None,
    );
    assert!(read(&level).is_ok());
}

#[test]
fn a_data_bar_stated_by_the_file_is_left_out() {
    let text = "[Scan]\nPixelWidth=1e-7\n[Image]\nResolutionX=50\nResolutionY=44\n";
    let section = read(&file_of(&[(34682, text)], None)).unwrap();
    assert_eq!(section.crop.height, 44);
    let step = section.steps.iter().find(|s| s.what == "crop").unwrap();
    assert!(step.text.contains("last 6 rows"), "{}", step.text);
}

/// A file of one page of a kind of sample.
fn page<C: ColorType>(values: &[C::Inner]) -> Vec<u8>
where
    [C::Inner]: TiffValue,
{
    let mut bytes = Cursor::new(Vec::new());
    let mut encoder = TiffEncoder::new(&mut bytes).unwrap();
    encoder.write_image::<C>(50, 50, values).unwrap();
    bytes.into_inner()
}

#[test]
fn kinds_of_samples_give_the_same_section() {
    let grey = disc();
    let area = |bytes: &[u8]| {
        let section = read_micrograph(bytes, &micrometre()).unwrap();
        assert!(
            (section.levels.fluid - 40.0).abs() < 1.0,
            "{:?}",
            section.levels
        );
        section.outline.area()
    };
    let exact = area(&page::<colortype::Gray8>(&grey));
    let wide = |factor: f64| grey.iter().map(move |v| f64::from(*v) * factor);
    let coloured: Vec<u8> = grey.iter().flat_map(|v| [*v, *v, *v]).collect();
    for bytes in [
        page::<colortype::Gray16>(&wide(1.0).map(|v| v as u16).collect::<Vec<_>>()),
        page::<colortype::Gray32>(&wide(1.0).map(|v| v as u32).collect::<Vec<_>>()),
        page::<colortype::Gray32Float>(&wide(1.0).map(|v| v as f32).collect::<Vec<_>>()),
        page::<colortype::GrayI16>(&wide(1.0).map(|v| v as i16).collect::<Vec<_>>()),
        page::<colortype::GrayI32>(&wide(1.0).map(|v| v as i32).collect::<Vec<_>>()),
        page::<colortype::RGB8>(&coloured),
    ] {
        let ratio = area(&bytes) / exact;
        assert!((ratio - 1.0).abs() < 1e-4, "{ratio}");
    }
    let mut hollow: Vec<f32> = wide(1.0).map(|v| v as f32).collect();
    hollow[7] = f32::NAN;
    let found = read_micrograph(&page::<colortype::Gray32Float>(&hollow), &micrometre());
    assert!(matches!(
        found,
        Err(MicrographProblem::UnsupportedPixels { .. })
    ));
}

#[test]
fn one_channel_of_a_coloured_picture_can_be_chosen() {
    // The section shows in green only.
    let raw: Vec<u8> = disc().iter().flat_map(|v| [90, *v, 120]).collect();
    let bytes = page::<colortype::RGB8>(&raw);
    let read = |channel| {
        let options = MicrographOptions {
            channel,
            ..micrometre()
        };
        read_micrograph(&bytes, &options)
    };
    let green = read(Channel::Green).unwrap();
    assert!((green.levels.wall - 200.0).abs() < 1.0);
    assert!(matches!(
        read(Channel::Red),
        Err(MicrographProblem::Uniform { .. })
    ));
    let grey = read(Channel::Grey).unwrap();
    assert!(
        (grey.levels.wall - (90.0 + 200.0 + 120.0) / 3.0).abs() < 0.5,
        "{:?}",
        grey.levels
    );
    let ratio = grey.outline.area() / green.outline.area();
    assert!((ratio - 1.0).abs() < 1e-3, "{ratio}");
}

#[test]
fn palettes_are_looked_up() {
    // Numbers run the other way than greys.
    let turned: Vec<u8> = disc().iter().map(|v| 255 - v).collect();
    let map: Vec<u16> = (0..3 * 256).map(|i| 257 * (255 - i % 256) as u16).collect();
    let mut bytes = Cursor::new(Vec::new());
    let mut encoder = TiffEncoder::new(&mut bytes).unwrap();
    let mut image = encoder.new_image::<colortype::Gray8>(50, 50).unwrap();
    image
        .encoder()
        .write_tag(Tag::Unknown(320), map.as_slice())
        .unwrap();
    image
        .encoder()
        .write_tag(Tag::PhotometricInterpretation, 3_u16)
        .unwrap();
    image.write_data(&turned).unwrap();
    let section = read_micrograph(&bytes.into_inner(), &micrometre()).unwrap();
    assert_eq!(section.fluid, Tone::Dark);
    assert!(
        (section.levels.fluid - 40.0).abs() < 1e-6,
        "{:?}",
        section.levels
    );
    assert!(section.steps.iter().any(|s| s.what == "palette"));
}

#[test]
fn pages_are_named_unless_the_others_are_reductions() {
    let file = |subfile: u32| {
        let mut bytes = Cursor::new(Vec::new());
        let mut encoder = TiffEncoder::new(&mut bytes).unwrap();
        let mut first = encoder.new_image::<colortype::Gray8>(10, 10).unwrap();
        first
            .encoder()
            .write_tag(Tag::NewSubfileType, subfile)
            .unwrap();
        first.write_data(&[7; 100]).unwrap();
        encoder
            .write_image::<colortype::Gray8>(50, 50, &disc())
            .unwrap();
        bytes.into_inner()
    };
    let found = read_micrograph(&file(0), &micrometre()).unwrap_err();
    assert!(
        found.is_ambiguous() && found.to_string().contains("page 2: 50 x 50"),
        "{found}"
    );
    let second = MicrographOptions {
        page: Some(2),
        ..micrometre()
    };
    assert_eq!(read_micrograph(&file(0), &second).unwrap().size, [50, 50]);
    assert_eq!(
        read_micrograph(&file(1), &micrometre()).unwrap().size,
        [50, 50]
    );
}
