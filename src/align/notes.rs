//! Sentences about what a reader of the figures should know.

use super::AMBIGUOUS_DELAY;
use super::mean::Extremum;

/// What there is to say about a delay.
pub(super) fn of(
    delay: f64,
    found: &Extremum,
    far_rival: Option<f64>,
    given: bool,
    (matching, sounding): (usize, usize),
) -> Vec<String> {
    let mut notes = Vec::new();
    let near = found.rival.map(|(lag, inverted)| (delay - found.lag + lag, inverted));
    if given {
        if let Some((rival, _)) = near.filter(|(_, inverted)| *inverted != found.inverted) {
            notes.push(format!(
                "polarity is ambiguous, as of a steady tone: with opposite sign a delay of {rival:.2} frames fits as \
                 well as the one given; the sign is the one that the given delay has"
            ));
        }
    } else if let Some((rival, inverted)) = near
        .filter(|(_, sign)| *sign == found.inverted || found.beside.is_none())
        .or(far_rival.map(|rival| (rival, found.inverted)))
    {
        let sign = if inverted == found.inverted { "" } else { " with opposite sign" };
        notes.push(format!(
            "{AMBIGUOUS_DELAY}, as of a steady tone or a repeated sound: {delay:.2} frames was taken, but \
             {rival:.2} frames{sign} fits as well; --delay settles it"
        ));
    }
    if let Some(beside) = found.beside.filter(|_| !given) {
        let other = delay - found.lag + beside;
        let taken = if found.inverted { "inverted" } else { "not inverted" };
        notes.push(format!(
            "polarity can't be told, as of a narrow band or a phase turned by a quarter: {taken} with a delay of {delay:.2} frames was taken, but \
             {other:.2} frames with opposite sign fits nearly as well"
        ));
    }
    if matching < 2 && sounding > 2 {
        notes.push(
            "no two places could be held against each other, as of a sweep: whether the clocks differ is not known; \
             an excitation with noise in it shows that"
                .to_owned(),
        );
    } else if 3 * matching < 2 * sounding && sounding > 1 {
        notes.push(format!(
            "before and after match in {matching} of {sounding} places looked at; elsewhere there are gaps, other \
             sounds, or noise above the signal"
        ));
    }
    notes
}
