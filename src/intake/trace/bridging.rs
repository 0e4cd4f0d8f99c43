//! Bridges over spikes and missing points: straight between the good samples on either side.

use super::corrected::{Change, ChangeKind};
use super::profile::{Profile, Zone};
use crate::intake::step::Step;
use crate::units::{format_length, format_percent};
use crate::warning::{Code, Warning};

/// Bridges every run of samples that is missing (NaN) or marked.
///
/// Heights are those after levelling. The first and the last sample must be good.
pub(super) fn bridge(profile: &mut Profile, is_spike: &[bool]) -> Vec<Change> {
    let mut changes = Vec::new();
    let mut before = 0;
    for (at, &is_spike) in is_spike.iter().enumerate() {
        if is_spike || profile.z[at].is_nan() {
            continue;
        }
        if at > before + 1 {
            changes.push(bridge_run(profile, before, at));
        }
        before = at;
    }
    changes
}

/// Bridges the samples between two good ones.
fn bridge_run(profile: &mut Profile, before: usize, after: usize) -> Change {
    let (x0, x1) = (profile.x[before], profile.x[after]);
    let (z0, z1) = (profile.z[before], profile.z[after]);
    let mut size = 0.0_f64;
    let mut is_missing = false;
    for at in before + 1..after {
        let straight = z0 + (z1 - z0) * (profile.x[at] - x0) / (x1 - x0);
        let above = profile.z[at] - straight;
        if above.is_nan() {
            is_missing = true;
        } else if above.abs() > size.abs() {
            size = above;
        }
        profile.z[at] = straight;
    }
    Change {
        kind: if is_missing {
            ChangeKind::Missing
        } else {
            ChangeKind::Spike
        },
        zone: Zone { from: x0, to: x1 },
        samples: after - before - 1,
        size: if is_missing { 0.0 } else { size },
    }
}

/// A bridge lies on a wall if the heights at its ends differ by more than this share of the depth.
const ON_WALL: f64 = 0.05;

/// A bridge is wide if it replaces more than this share of the width of the narrowest channel.
const WIDE: f64 = 0.05;

/// Bridges are many if they replace more than this share of the samples of one channel, or of the trace.
const MANY: f64 = 0.05;

/// Bridges that are listed one by one; the rest is summed up.
const LISTED: usize = 20;

impl Change {
    /// Length that the replaced samples stand for, m: without the one spacing more from end to end.
    fn replaced(&self) -> f64 {
        let samples = self.samples as f64;
        (self.zone.to - self.zone.from) * samples / (samples + 1.0)
    }
}

/// What of the trace bridges can have moved.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Doubts {
    /// Bridges on a wall.
    on_walls: usize,
    /// Bridges that replace too much of a channel's width.
    wide: usize,
    /// Largest share of samples bridged, of a channel or of the trace.
    share: f64,
    /// The widest bridge from end to end, m.
    widest: f64,
}

impl Doubts {
    /// Whether bridges can have moved the result.
    fn matter(&self) -> bool {
        self.on_walls + self.wide > 0 || self.share > MANY
    }
}

/// The list of bridges, one step each: the widest and highest, in their order along the trace.
pub(super) fn bridge_list(changes: &[Change]) -> Vec<Step> {
    let mut order: Vec<&Change> = changes.iter().collect();
    order.sort_by(|a, b| {
        let widths = b.samples.cmp(&a.samples);
        widths.then(b.size.abs().total_cmp(&a.size.abs()))
    });
    let rest = order.split_off(order.len().min(LISTED));
    order.sort_by(|a, b| a.zone.from.total_cmp(&b.zone.from));
    let mut steps: Vec<Step> = order.into_iter().map(listed).collect();
    if let Some(largest) = rest.first() {
        let samples: usize = rest.iter().map(|c| c.samples).sum();
        let text = format!(
            "and {} more of at most {} sample(s) each, {samples} in all; the check picture marks them",
            rest.len(),
            largest.samples
        );
        let numbers = [("more", rest.len() as f64), ("samples", samples as f64)];
        steps.push(Step::new("bridges", text).with(&numbers));
    }
    steps
}

/// One bridge with its place and size.
fn listed(change: &Change) -> Step {
    let what = match change.kind {
        ChangeKind::Spike => {
            let side = if change.size < 0.0 { "below" } else { "above" };
            let size = format_length(change.size.abs());
            format!("spike of {} sample(s), {size} {side}", change.samples)
        }
        ChangeKind::Missing => format!("gap of {} sample(s)", change.samples),
    };
    let Zone { from, to } = change.zone;
    let text = format!(
        "{what} the straight line from {} to {}",
        format_length(from),
        format_length(to)
    );
    let text = match change.kind {
        ChangeKind::Spike => text,
        ChangeKind::Missing => text.replacen("the straight", "bridged by the straight", 1),
    };
    Step::new("bridge", text).with(&[
        ("from_m", from),
        ("to_m", to),
        ("samples", change.samples as f64),
        ("size_m", change.size),
    ])
}

/// The warning about bridges, where they can have moved the result: one lies on a wall ([`ON_WALL`]), is
/// wide beside the channels ([`WIDE`]), or they are many ([`MANY`]). Where no channel is known, no bridge
/// is known to be narrow, and every one counts as wide.
pub(super) fn bridge_warning(
    changes: &[Change],
    profile: &Profile,
    grooves: &[Zone],
    depth: f64,
) -> Option<Warning> {
    let doubts = doubts(changes, profile, grooves, depth);
    if !doubts.matter() {
        return None;
    }
    let count = |kind| {
        let of_kind = changes.iter().filter(|c| c.kind == kind);
        let samples: usize = of_kind.clone().map(|c| c.samples).sum();
        (of_kind.count(), samples)
    };
    let (spikes, spike_samples) = count(ChangeKind::Spike);
    let (gaps, missing) = count(ChangeKind::Missing);
    let mut parts = Vec::new();
    if spikes > 0 {
        parts.push(format!("{spikes} spike(s) ({spike_samples} samples)"));
    }
    if gaps > 0 {
        parts.push(format!("{gaps} gap(s) ({missing} samples)"));
    }
    Some(Warning {
        code: Code::SamplesBridged,
        message: format!(
            "{} bridged by straight lines, which may move the section: {}",
            parts.join(" and "),
            doubts.words(grooves.is_empty())
        ),
        advice: if doubts.on_walls + doubts.wide > 0 {
            "the wall or the floor there is a guess: measure again, or take another channel; the steps \
             list the bridges"
        } else {
            "the steps list the bridges; --keep-spikes leaves spikes, --spike-size sets their height"
        }
        .to_owned(),
        numbers: vec![
            ("spikes", spikes as f64),
            ("spike_samples", spike_samples as f64),
            ("gaps", gaps as f64),
            ("missing_samples", missing as f64),
            ("widest_m", doubts.widest),
            ("on_walls", doubts.on_walls as f64),
            ("wide", doubts.wide as f64),
            ("largest_share", doubts.share),
        ],
    })
}

impl Doubts {
    /// What may have moved the section.
    fn words(&self, no_channel: bool) -> String {
        let mut found = Vec::new();
        if self.on_walls > 0 {
            found.push(format!(
                "{} on a wall (ends differ in height by more than {} of the depth)",
                self.on_walls,
                format_percent(ON_WALL, 2)
            ));
        }
        if self.wide > 0 {
            let limit = if no_channel {
                "no channel is known to set them against".to_owned()
            } else {
                let limit = format_percent(WIDE, 2);
                format!("more than {limit} of the narrowest channel's width")
            };
            found.push(format!(
                "{} wide ({limit}), the widest over {}",
                self.wide,
                format_length(self.widest)
            ));
        }
        if self.share > MANY {
            found.push(format!(
                "{} of the samples of one channel or of the trace",
                format_percent(self.share, 3)
            ));
        }
        found.join("; ")
    }
}

fn doubts(changes: &[Change], profile: &Profile, grooves: &[Zone], depth: f64) -> Doubts {
    let index = |x: f64| profile.x.partition_point(|p| *p < x);
    let height = |x: f64| profile.z.get(index(x)).copied().unwrap_or(f64::NAN);
    let widths = grooves.iter().map(|groove| groove.to - groove.from);
    let narrowest = widths.fold(f64::INFINITY, f64::min);
    let limit = if narrowest.is_finite() {
        WIDE * narrowest
    } else {
        0.0
    };
    let is_within = |value: f64, limit: f64| value <= limit;
    let samples: usize = changes.iter().map(|c| c.samples).sum();
    let mut found = Doubts {
        on_walls: 0,
        wide: 0,
        share: samples as f64 / profile.x.len().max(1) as f64,
        widest: 0.0,
    };
    for change in changes {
        let Zone { from, to } = change.zone;
        found.widest = found.widest.max(to - from);
        let rise = (height(from) - height(to)).abs();
        found.on_walls += usize::from(!is_within(rise, ON_WALL * depth));
        found.wide += usize::from(!is_within(change.replaced(), limit));
    }
    for groove in grooves {
        let first = changes.partition_point(|c| c.zone.to <= groove.from);
        let inside = changes[first..]
            .iter()
            .take_while(|c| c.zone.from < groove.to);
        let bridged: usize = inside.map(|c| c.samples).sum();
        let all = index(groove.to).saturating_sub(index(groove.from)).max(1);
        found.share = found.share.max(bridged as f64 / all as f64);
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bridges_are_straight_and_listed() {
        let mut profile = Profile {
            x: vec![0.0, 1.0, 2.0, 3.0, 5.0, 6.0, 7.0, 8.0],
            z: vec![0.0, 9.0, 2.0, f64::NAN, f64::NAN, 8.0, -4.0, 8.0],
        };
        let spikes = [false, true, false, false, false, false, true, false];
        let changes = bridge(&mut profile, &spikes);
        assert_eq!(profile.z, [0.0, 1.0, 2.0, 3.5, 6.5, 8.0, 8.0, 8.0]);
        let kinds: Vec<_> = changes
            .iter()
            .map(|c| (c.kind, c.samples, c.size))
            .collect();
        assert_eq!(
            kinds,
            [
                (ChangeKind::Spike, 1, 8.0),
                (ChangeKind::Missing, 2, 0.0),
                (ChangeKind::Spike, 1, -12.0)
            ]
        );
        let grooves = [Zone { from: 1.0, to: 7.0 }];
        let warning = bridge_warning(&changes, &profile, &grooves, 9.0).unwrap();
        assert!(warning.message.contains("2 on a wall"), "{warning:?}");
        assert!(warning.message.contains("3 wide"), "{warning:?}");
        assert!(bridge_warning(&[], &profile, &grooves, 9.0).is_none());
    }

    /// A trough of 100 samples, 9 deep, between lands of 200, with samples made missing.
    fn with_gaps(gaps: &[(usize, usize)]) -> (Vec<Change>, Profile) {
        let mut profile = Profile {
            x: (0..500).map(f64::from).collect(),
            z: (0..500)
                .map(|k| if (200..300).contains(&k) { -9.0 } else { 0.0 })
                .collect(),
        };
        for &(at, samples) in gaps {
            profile.z[at..at + samples].fill(f64::NAN);
        }
        let changes = bridge(&mut profile, &[false; 500]);
        (changes, profile)
    }

    #[test]
    fn only_bridges_that_can_move_the_section_are_a_warning() {
        let grooves = [Zone {
            from: 199.0,
            to: 300.0,
        }];
        let warned = |gaps: &[(usize, usize)], grooves: &[Zone]| {
            let (changes, profile) = with_gaps(gaps);
            bridge_warning(&changes, &profile, grooves, 9.0)
        };
        assert!(warned(&[(50, 1), (250, 5), (400, 3)], &grooves).is_none());
        for (gaps, words) in [
            (&[(199, 1)][..], "1 on a wall"),
            (&[(250, 6)], "1 wide"),
            (&[(50, 6)], "1 wide"),
            (&[(220, 2), (240, 2), (260, 2)], "5.94 % of the samples"),
        ] {
            let warning = warned(gaps, &grooves).unwrap();
            assert!(warning.message.contains(words), "{warning:?}");
        }
        let unknown = warned(&[(50, 1)], &[]).unwrap();
        assert!(unknown.message.contains("no channel is known"));
    }

    #[test]
    fn every_bridge_is_listed_up_to_twenty() {
        let gaps: Vec<_> = (0..25)
            .map(|k| (4 + 4 * k, 1 + usize::from(k == 24)))
            .collect();
        let (changes, _) = with_gaps(&gaps);
        let steps = bridge_list(&changes);
        assert_eq!(steps.len(), LISTED + 1);
        assert!(steps[19].text.contains("gap of 2 sample(s)"), "{steps:?}");
        assert!(steps[19].numbers.contains(&("from_m", 99.0)));
        assert!(steps[20].text.contains("and 5 more"));
        assert!(bridge_list(&changes[..20]).len() == 20 && bridge_list(&[]).is_empty());
    }
}
