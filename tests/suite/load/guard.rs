//! The promises of the table of keys, held against the reader.

use fixability::bounds::{KEYS, Kind, Need};

use super::Scene;

#[test]
fn every_required_key_is_missed_by_name() {
    for key in KEYS.iter().filter(|k| k.need == Need::Required) {
        let line = super::DIVE
            .lines()
            .find(|l| l.starts_with(&format!("{} ", key.name)))
            .unwrap_or_else(|| panic!("the sound dive file lacks {}", key.full_name()));
        let text = Scene::new().swap(&format!("{line}\n"), "").errors();
        assert!(text.contains(&format!("key {}: is missing", key.full_name())), "{text}");
    }
}

#[test]
fn every_number_outside_its_range_is_refused_by_name() {
    for key in KEYS {
        let (Kind::Number(range) | Kind::Whole(range)) = key.kind else { continue };
        let bad = format!(
            "{} = {}",
            key.name,
            if matches!(key.kind, Kind::Whole(_)) { -1.0 } else { range.high * 2.0 }
        );
        let scene = match super::DIVE.lines().find(|l| l.starts_with(&format!("{} ", key.name))) {
            Some(line) => Scene::new().swap(line, &bad),
            None => {
                let header = format!("[{}]\n", key.section);
                if super::DIVE.contains(&header) {
                    Scene::new().swap(&header, &format!("{header}{bad}\n"))
                } else {
                    // A table that the sound dive file leaves out goes to its top level's end, before the others.
                    Scene::new().swap("[map]\n", &format!("{header}{bad}\n[map]\n"))
                }
            }
        };
        let text = scene.errors();
        assert!(
            text.contains(&format!("key {}: ", key.full_name())) && text.contains("is out of range"),
            "{text}"
        );
    }
}
