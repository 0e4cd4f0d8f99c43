//! Bridges over spikes and missing points: straight between the good samples on either side.

use super::corrected::{Change, ChangeKind};
use super::profile::{Profile, Zone};
use crate::units::format_length;
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

/// What bridges may have hidden.
struct Doubts {
    /// Bridges over a wall, widest.
    walls: usize,
    /// Bridges over more than half of a channel.
    wide: usize,
    /// The widest bridge, m.
    widest: f64,
}

/// The warning about bridges, if there are any.
pub(super) fn bridge_warning(
    changes: &[Change],
    profile: &Profile,
    grooves: &[Zone],
    depth: f64,
) -> Option<Warning> {
    if changes.is_empty() {
        return None;
    }
    let count = |kind| {
        let of_kind = changes.iter().filter(|c| c.kind == kind);
        let samples: usize = of_kind.clone().map(|c| c.samples).sum();
        (of_kind.count(), samples)
    };
    let (spikes, spike_samples) = count(ChangeKind::Spike);
    let (gaps, missing) = count(ChangeKind::Missing);
    let doubts = doubts(changes, profile, grooves, depth);
    let mut parts = Vec::new();
    if spikes > 0 {
        parts.push(format!("{spikes} spike(s) ({spike_samples} samples)"));
    }
    if gaps > 0 {
        parts.push(format!("{gaps} gap(s) ({missing} samples)"));
    }
    let mut message = vec![format!(
        "{} bridged by straight lines, the widest over {}",
        parts.join(" and "),
        format_length(doubts.widest)
    )];
    if doubts.walls > 0 {
        message.push(format!("{} of them over a wall", doubts.walls));
    }
    if doubts.wide > 0 {
        message.push(format!("{} over more than half of a channel", doubts.wide));
    }
    let advice = if doubts.walls + doubts.wide > 0 {
        "the wall or the floor there is a guess: measure again, or take another channel"
    } else if spikes > 0 {
        "look at the list of changes; --keep-spikes leaves spikes, --spike-size sets their height"
    } else {
        "look at the list of changes"
    };
    Some(Warning {
        code: Code::SamplesBridged,
        message: message.join("; "),
        advice: advice.to_owned(),
        numbers: vec![
            ("spikes", spikes as f64),
            ("spike_samples", spike_samples as f64),
            ("gaps", gaps as f64),
            ("missing_samples", missing as f64),
            ("widest_m", doubts.widest),
            ("over_walls", doubts.walls as f64),
            ("over_half_a_channel", doubts.wide as f64),
        ],
    })
}

fn doubts(changes: &[Change], profile: &Profile, grooves: &[Zone], depth: f64) -> Doubts {
    let height = |x: f64| {
        let at = profile.x.partition_point(|p| *p < x);
        profile.z.get(at).copied().unwrap_or(f64::NAN)
    };
    let mut found = Doubts {
        walls: 0,
        wide: 0,
        widest: 0.0,
    };
    for change in changes {
        let zone = change.zone;
        found.widest = found.widest.max(zone.to - zone.from);
        if (height(zone.from) - height(zone.to)).abs() > 0.3 * depth {
            found.walls += 1;
        }
        let first = grooves.partition_point(|groove| groove.to <= zone.from);
        let crossed = grooves[first..].iter().take_while(|g| g.from < zone.to);
        let covers = |groove: &Zone| {
            let part = zone.to.min(groove.to) - zone.from.max(groove.from);
            part > 0.5 * (groove.to - groove.from)
        };
        if crossed.into_iter().any(covers) {
            found.wide += 1;
        }
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
        assert!(
            warning.message.contains("1 of them over a wall"),
            "{}",
            warning.message
        );
        assert!(warning.message.contains("more than half of a channel"));
        assert!(bridge_warning(&[], &profile, &grooves, 9.0).is_none());
    }
}
