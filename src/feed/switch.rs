use std::sync::{Arc, PoisonError, RwLock};

use super::Channels;

/// The channels in force, for inputs that are being read meanwhile.
#[derive(Debug, Clone)]
pub(super) struct Switch(Arc<RwLock<Arc<Channels>>>);

impl Switch {
    pub fn new(channels: &Arc<Channels>) -> Self {
        Self(Arc::new(RwLock::new(channels.clone())))
    }

    pub fn set(&self, channels: &Arc<Channels>) {
        *self.0.write().unwrap_or_else(PoisonError::into_inner) = channels.clone();
    }

    /// The channels in force, if they are others than these.
    pub fn other_than(&self, channels: &Arc<Channels>) -> Option<Arc<Channels>> {
        let current = self.0.read().unwrap_or_else(PoisonError::into_inner);
        (!Arc::ptr_eq(&current, channels)).then(|| current.clone())
    }
}
