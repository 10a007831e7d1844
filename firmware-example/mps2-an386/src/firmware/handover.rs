//! How the main program gives an interrupt what it works with, and gets it
//! back at the end.

use core::cell::RefCell;

use critical_section::Mutex;

/// A place where one context leaves a value for another.
pub(crate) struct Handover<T>(Mutex<RefCell<Option<T>>>);

impl<T> Handover<T> {
    pub(crate) const fn new() -> Self {
        Self(Mutex::new(RefCell::new(None)))
    }

    /// Leaves `value`.
    pub(crate) fn give(&self, value: Option<T>) {
        critical_section::with(|section| *self.0.borrow_ref_mut(section) = value);
    }

    /// Takes what was left, if anything was.
    pub(crate) fn take(&self) -> Option<T> {
        critical_section::with(|section| self.0.borrow_ref_mut(section).take())
    }
}
