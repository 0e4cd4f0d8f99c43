//! The description in an x3p file: `main.xml` with its axes, dimensions, links and data lists.
//!
//! Elements are found by their local names, so that files with an odd root element or namespace are read
//! too; both are noted as defects. Entities are never expanded: a document type declaration is refused.

use roxmltree::{Document, Node, ParsingOptions};

use super::file_defects::FileDefects;
use super::map_problem::MapProblem;
use super::stored_number::StoredNumber;

/// Namespace of the root element.
const NAMESPACE: &str = "http://www.opengps.eu/2008/ISO5436_2";
/// Name of the root element.
const ROOT: &str = "ISO5436_2";
/// Largest number of XML nodes; some 100 bytes of memory each.
const MOST_NODES: u32 = 4_000_000;
/// Most entries of metadata and most characters of one.
const MOST_METADATA: usize = 500;
const LONGEST_METADATA: usize = 2000;

/// What kind of data a file holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Feature {
    Surface,
    Profile,
    PointCloud,
}

/// One axis.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Axis {
    /// Whether every point carries its coordinate, rather than its index giving it.
    pub(super) absolute: bool,
    /// Type of stored numbers.
    pub(super) number: StoredNumber,
    /// Length of one unit of a stored number or index, in the unit of the file.
    pub(super) increment: f64,
    /// Coordinate of the stored number or index zero, in the unit of the file.
    pub(super) offset: f64,
}

/// How many points there are.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Dimension {
    /// Points along x, along y, and layers.
    Matrix([u64; 3]),
    /// A list of points.
    List(u64),
}

/// Files with the points.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub(super) struct Links {
    pub(super) points: String,
    pub(super) points_md5: Option<String>,
    pub(super) valid: Option<String>,
    pub(super) valid_md5: Option<String>,
}

/// Where the points are.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Points {
    /// In files of the container.
    Linked(Links),
    /// In the description, one text a point; empty where missing.
    Listed(Vec<String>),
}

/// The content of `main.xml`.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Description {
    pub(super) feature: Feature,
    /// Axes x, y, z.
    pub(super) axes: [Axis; 3],
    pub(super) dimension: Dimension,
    pub(super) points: Points,
    /// Rotation of the surface in space, where it is not the identity.
    pub(super) rotated: bool,
    /// File with the check sum of `main.xml`.
    pub(super) checksum_file: Option<String>,
    /// Revision, feature type and all of the second record.
    pub(super) metadata: Vec<(String, String)>,
}

/// Reads `main.xml`.
pub(super) fn read_description(
    text: &str,
    defects: &mut FileDefects,
) -> Result<Description, MapProblem> {
    let options = ParsingOptions {
        nodes_limit: MOST_NODES,
        ..ParsingOptions::default()
    };
    let document = Document::parse_with_options(text, options).map_err(|error| match error {
        roxmltree::Error::DtdDetected => MapProblem::XmlDeclaresTypes,
        other => MapProblem::Xml {
            message: other.to_string(),
        },
    })?;
    let root = document.root_element();
    note_root(root, defects);
    let record1 = needed(root, "Record1")?;
    let record3 = needed(root, "Record3")?;
    let axes_of = needed(record1, "Axes")?;
    let feature = feature(record1)?;
    Ok(Description {
        feature,
        axes: [
            axis(axes_of, "CX")?,
            axis(axes_of, "CY")?,
            axis(axes_of, "CZ")?,
        ],
        dimension: dimension(record3)?,
        points: points(record3)?,
        rotated: is_rotated(axes_of),
        checksum_file: child(root, "Record4").and_then(|record| text_of(record, "ChecksumFile")),
        metadata: metadata(root),
    })
}

/// Notes an unusual root element or namespace.
fn note_root(root: Node, defects: &mut FileDefects) {
    let tag = root.tag_name();
    if tag.name() != ROOT {
        defects.note(format!(
            "the root element of main.xml is `{}` instead of `{ROOT}`",
            shortened(tag.name())
        ));
    }
    match tag.namespace() {
        Some(NAMESPACE) => {}
        Some(other) => defects.note(format!(
            "the namespace of main.xml is `{}` instead of `{NAMESPACE}`",
            shortened(other)
        )),
        None => defects.note(format!(
            "the root element of main.xml is in no namespace; `{NAMESPACE}` is the standard's"
        )),
    }
}

fn feature(record: Node) -> Result<Feature, MapProblem> {
    let text = needed_text(record, "FeatureType")?;
    match text.to_ascii_uppercase().as_str() {
        "SUR" => Ok(Feature::Surface),
        "PRF" => Ok(Feature::Profile),
        "PCL" => Ok(Feature::PointCloud),
        _ => Err(bad_value("FeatureType", &text, "SUR, PRF or PCL")),
    }
}

fn axis(axes: Node, name: &str) -> Result<Axis, MapProblem> {
    let node = needed(axes, name)?;
    let inside = |element: &str| format!("{name}/{element}");
    let kind = text_of(node, "AxisType").ok_or_else(|| MapProblem::ElementMissing {
        element: inside("AxisType"),
    })?;
    let absolute = match kind.to_ascii_uppercase().as_str() {
        "A" => true,
        "I" => false,
        _ => return Err(bad_value(&inside("AxisType"), &kind, "I or A")),
    };
    let number = match text_of(node, "DataType") {
        Some(text) => match text.to_ascii_uppercase().as_str() {
            "I" => StoredNumber::Signed16,
            "L" => StoredNumber::Signed32,
            "F" => StoredNumber::Float32,
            "D" => StoredNumber::Float64,
            _ => return Err(bad_value(&inside("DataType"), &text, "I, L, F or D")),
        },
        // Only numbers that are stored have a type.
        None if !absolute => StoredNumber::Float64,
        None => {
            return Err(MapProblem::ElementMissing {
                element: inside("DataType"),
            });
        }
    };
    let increment = match text_of(node, "Increment") {
        Some(text) => finite(&inside("Increment"), &text)?,
        None if absolute => 1.0,
        None => {
            return Err(MapProblem::ElementMissing {
                element: inside("Increment"),
            });
        }
    };
    if increment == 0.0 {
        return Err(bad_value(
            &inside("Increment"),
            "0",
            "a number other than zero",
        ));
    }
    let offset = match text_of(node, "Offset") {
        Some(text) => finite(&inside("Offset"), &text)?,
        None => 0.0,
    };
    Ok(Axis {
        absolute,
        number,
        increment,
        offset,
    })
}

fn dimension(record: Node) -> Result<Dimension, MapProblem> {
    if let Some(matrix) = child(record, "MatrixDimension") {
        let size = |name: &'static str, absent: Option<u64>| match (text_of(matrix, name), absent) {
            (Some(text), _) => whole(name, &text),
            (None, Some(size)) => Ok(size),
            (None, None) => Err(MapProblem::ElementMissing {
                element: name.to_owned(),
            }),
        };
        return Ok(Dimension::Matrix([
            size("SizeX", None)?,
            size("SizeY", Some(1))?,
            size("SizeZ", Some(1))?,
        ]));
    }
    match text_of(record, "ListDimension") {
        Some(text) => Ok(Dimension::List(whole("ListDimension", &text)?)),
        None => Err(MapProblem::ElementMissing {
            element: "MatrixDimension".to_owned(),
        }),
    }
}

fn points(record: Node) -> Result<Points, MapProblem> {
    if let Some(link) = child(record, "DataLink") {
        return Ok(Points::Linked(Links {
            points: needed_text(link, "PointDataLink")?,
            points_md5: text_of(link, "MD5ChecksumPointData"),
            valid: text_of(link, "ValidPointsLink"),
            valid_md5: text_of(link, "MD5ChecksumValidPoints"),
        }));
    }
    let list = child(record, "DataList").ok_or_else(|| MapProblem::ElementMissing {
        element: "DataLink".to_owned(),
    })?;
    let items = list
        .children()
        .filter(|node| node.has_tag_name_local("Datum"));
    Ok(Points::Listed(
        items
            .map(|node| node.text().unwrap_or("").trim().to_owned())
            .collect(),
    ))
}

/// Whether a rotation other than the identity is stated.
fn is_rotated(axes: Node) -> bool {
    let Some(rotation) = child(axes, "Rotation") else {
        return false;
    };
    let mut elements = rotation.children().filter(Node::is_element);
    elements.any(|node| {
        let name = node.tag_name().name();
        let identity = if matches!(name, "r11" | "r22" | "r33") {
            1.0
        } else {
            0.0
        };
        let value = node.text().and_then(|text| text.trim().parse::<f64>().ok());
        value.is_none_or(|value| (value - identity).abs() > 1e-9)
    })
}

/// Texts of the second record and what the first says of the kind of file.
fn metadata(root: Node) -> Vec<(String, String)> {
    let mut found = Vec::new();
    if let Some(record) = child(root, "Record1") {
        for name in ["Revision", "FeatureType"] {
            if let Some(text) = text_of(record, name) {
                found.push((name.to_owned(), shortened(&text)));
            }
        }
    }
    if let Some(record) = child(root, "Record2") {
        for node in record.descendants().filter(Node::is_element) {
            let has_elements = node.children().any(|inner| inner.is_element());
            let text = node.text().map_or("", str::trim);
            if has_elements || text.is_empty() || found.len() >= MOST_METADATA {
                continue;
            }
            let parent = node.parent().map(|parent| parent.tag_name().name());
            let key = match parent {
                Some(parent) if parent != "Record2" => {
                    format!("{parent}/{}", node.tag_name().name())
                }
                _ => node.tag_name().name().to_owned(),
            };
            found.push((shortened(&key), shortened(text)));
        }
    }
    found
}

/// Elements by their local name.
trait LocalName {
    fn has_tag_name_local(&self, name: &str) -> bool;
}

impl LocalName for Node<'_, '_> {
    fn has_tag_name_local(&self, name: &str) -> bool {
        self.is_element() && self.tag_name().name() == name
    }
}

/// The first child element of that name.
fn child<'a, 'i>(node: Node<'a, 'i>, name: &str) -> Option<Node<'a, 'i>> {
    node.children().find(|inner| inner.has_tag_name_local(name))
}

fn needed<'a, 'i>(node: Node<'a, 'i>, name: &str) -> Result<Node<'a, 'i>, MapProblem> {
    child(node, name).ok_or_else(|| MapProblem::ElementMissing {
        element: name.to_owned(),
    })
}

/// The text of a child element; `None` where it is absent or empty.
fn text_of(node: Node, name: &str) -> Option<String> {
    let text = child(node, name)?.text()?.trim();
    (!text.is_empty()).then(|| text.to_owned())
}

fn needed_text(node: Node, name: &str) -> Result<String, MapProblem> {
    text_of(node, name).ok_or_else(|| MapProblem::ElementMissing {
        element: name.to_owned(),
    })
}

fn finite(element: &str, text: &str) -> Result<f64, MapProblem> {
    let value = text.parse::<f64>().ok().filter(|value| value.is_finite());
    value.ok_or_else(|| bad_value(element, text, "a finite number"))
}

fn whole(element: &str, text: &str) -> Result<u64, MapProblem> {
    text.parse()
        .map_err(|_| bad_value(element, text, "a whole number"))
}

fn bad_value(element: &str, text: &str, needed: &'static str) -> MapProblem {
    MapProblem::ElementValue {
        element: element.to_owned(),
        text: shortened(text),
        needed,
    }
}

/// A text cut to a length that can be shown.
pub(super) fn shortened(text: &str) -> String {
    text.chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .take(LONGEST_METADATA)
        .collect()
}
