//! How much memory the process took, and how much is left. Known on Linux only.

/// A line such as `VmHWM:   123456 kB` of one of the files in /proc, in bytes.
fn field(text: &str, name: &str) -> Option<u64> {
    let line = text.lines().find_map(|l| l.strip_prefix(name)?.strip_prefix(':'))?;
    let kilobytes: u64 = line.trim().strip_suffix("kB")?.trim().parse().ok()?;
    Some(kilobytes * 1024)
}

fn read(path: &str, name: &str) -> Option<u64> {
    field(&std::fs::read_to_string(path).ok()?, name)
}

/// The most memory the process ever held, in bytes.
pub fn peak_bytes() -> Option<u64> {
    read("/proc/self/status", "VmHWM")
}

/// Memory that can still be had without swapping, in bytes.
pub fn available_bytes() -> Option<u64> {
    read("/proc/meminfo", "MemAvailable")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fields_are_read() {
        let text = "VmPeak:\t  9 kB\nVmHWM:\t    1234 kB\nThreads:\t1\n";
        assert_eq!(field(text, "VmHWM"), Some(1234 * 1024));
        assert_eq!(field(text, "Threads"), None);
        assert_eq!(field(text, "Vm"), None);
    }

    #[test]
    #[cfg(target_os = "linux")]
    fn this_process_has_a_peak() {
        assert!(peak_bytes().unwrap() > 1 << 16);
        assert!(available_bytes().unwrap() > 1 << 16);
    }
}
