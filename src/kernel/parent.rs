//! Ending with the process that started the kernel.
//!
//! A client that is killed cannot say goodbye, and a kernel without it would run for ever. [`gone`] waits for that.
//! The environment names the client's process, and the name is believed only if it is our parent: through a wrapper
//! script or in a container it is not, and then nothing is watched.

use std::env;
use std::future::pending;
use std::os::unix::process::parent_id;
use std::time::Duration;

/// How often the parent is looked for.
const PERIOD: Duration = Duration::from_secs(1);

/// Comes back when the parent that was there at the start is gone; never, where there is none to be watched.
pub async fn gone() {
    let named = env::var("JPY_PARENT_PID").ok();
    let Some(watched) = watched(named.as_deref(), parent_id()) else { return pending().await };
    // An orphan gets another parent, whichever process that is.
    while parent_id() == watched {
        tokio::time::sleep(PERIOD).await;
    }
}

/// The parent to be watched: the one that is named, if it is ours and not the first process of the system.
fn watched(named: Option<&str>, parent: u32) -> Option<u32> {
    let named: u32 = named?.parse().ok()?;
    (named == parent && named > 1).then_some(named)
}

#[cfg(test)]
mod tests {
    use super::watched;

    #[test]
    fn only_a_named_direct_parent_is_watched() {
        assert_eq!(watched(Some("42"), 42), Some(42));
        assert_eq!(watched(Some("42"), 43), None); // through a wrapper script
        assert_eq!(watched(Some("1"), 1), None); // in a container
        assert_eq!(watched(Some(""), 42), None);
        assert_eq!(watched(Some("junk"), 42), None);
        assert_eq!(watched(None, 42), None);
    }
}
