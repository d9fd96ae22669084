use ratatui::layout::Size;

/// A part of the corridor page.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Panel {
    /// Every outage with its margins and limits.
    Outages,
    /// The power-angle curves.
    Curves,
    /// Actions and reclosing.
    Actions,
    /// Both sources.
    Sources,
    /// Circuits and buses as they stand.
    Network,
    /// Why to believe it.
    Data,
}

use Panel::{Actions, Curves, Data, Network, Outages, Sources};

const SMALL: &[&[Panel]] = &[&[Outages], &[Curves], &[Actions], &[Sources], &[Network], &[Data]];
const MEDIUM: &[&[Panel]] = &[&[Outages, Curves, Actions], &[Sources, Network, Data]];
const LARGE: &[&[Panel]] = &[&[Outages, Curves, Actions, Sources, Network, Data]];

impl Panel {
    /// Which panels stand together on a terminal of this size.
    pub fn pages(size: Size) -> &'static [&'static [Panel]] {
        match (size.width, size.height) {
            (170.., 45..) => LARGE,
            (110.., 34..) => MEDIUM,
            _ => SMALL,
        }
    }

    /// The panels shown together with this one.
    pub fn page(self, size: Size) -> &'static [Panel] {
        let pages = Self::pages(size);
        pages.iter().find(|page| page.contains(&self)).unwrap_or(&pages[0])
    }

    /// The first panel of the next page, or with `back` of the one before.
    pub(super) fn turned(self, size: Size, back: bool) -> Panel {
        let pages = Self::pages(size);
        let here = pages.iter().position(|page| page.contains(&self)).unwrap_or(0);
        let step = if back { pages.len() - 1 } else { 1 };
        pages[(here + step) % pages.len()][0]
    }

    /// Its heading.
    pub fn title(self) -> &'static str {
        match self {
            Outages => "Outages",
            Curves => "Curves",
            Actions => "Actions",
            Sources => "Sources",
            Network => "Network",
            Data => "Data",
        }
    }
}
