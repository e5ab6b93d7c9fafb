//! Which devices a build reaches, and how the rules that judge their data name them.
//! Must not know what is judged.

use std::rc::Rc;

use super::case::Case;
use crate::build::parts::{Device, Stage};
use crate::finding::Part;

impl Case<'_> {
    /// Every stage of the amplifier, from the output back.
    #[must_use]
    pub fn stages(&self) -> Vec<&Rc<Stage>> {
        let mut stages = self.followers();
        stages.extend(self.build.amplifier.voltage_amplifier.as_ref());
        stages
    }

    /// Every declared device of those stages, once each.
    #[must_use]
    pub fn devices(&self) -> Vec<&Rc<Device>> {
        let mut found: Vec<&Rc<Device>> = Vec::new();
        for device in self.stages().into_iter().flat_map(|s| [&s.upper, &s.lower]) {
            // a stage that names no known device stands in for one
            let declared = device.owner.kind == "device";
            if declared && !found.iter().any(|d| d.owner.name == device.owner.name) {
                found.push(device);
            }
        }
        found
    }
}

/// A line of a device as a part.
#[must_use]
pub fn data_part(device: &Device, key: &'static str) -> Part {
    Part {
        name: device.owner.name.clone(),
        block: device.owner.name.clone(),
        key,
        order_code: device.codes.first().cloned(),
        ..Part::default()
    }
}
