//! Writer of ANSI/IES TM-27-14 XML, the open exchange format for spectral data.
//!
//! Element names and order follow public samples and open readers of the format. Text is escaped, nothing is an entity of its
//! own; characters XML cannot hold are left out. [`crate::read`] reads what is written here back to the same numbers.

use quick_xml::Writer;
use quick_xml::events::{BytesDecl, BytesEnd, BytesStart, BytesText, Event};

/// The header of a TM-27 file. The format requires a description, a document creator and a creation date.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Tm27Header {
    /// What the spectrum is of.
    pub description: String,
    /// Who made the document.
    pub document_creator: String,
    /// When, as `YYYY-MM-DD`.
    pub document_creation_date: String,
    /// Remarks; left out when empty.
    pub comments: String,
}

/// The quantity of a distribution; TM-27 has no photon quantities.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Tm27Quantity {
    /// Radiant flux, W/nm.
    Flux,
    /// Radiant intensity, W/sr/nm.
    Intensity,
    /// Irradiance, W/m²/nm.
    Irradiance,
    /// Radiance, W/sr/m²/nm.
    Radiance,
    /// Exitance, W/m²/nm.
    Exitance,
    /// Relative power per nm.
    Relative,
}

impl Tm27Quantity {
    const fn word(self) -> &'static str {
        match self {
            Self::Flux => "flux",
            Self::Intensity => "intensity",
            Self::Irradiance => "irradiance",
            Self::Radiance => "radiance",
            Self::Exitance => "exitance",
            Self::Relative => "relative",
        }
    }
}

/// The text of a TM-27-14 file: wavelengths in nm and power per nm, shortest numbers that read back the same.
///
/// # Errors
/// Only when the XML writer fails, which writing to memory does not.
pub fn tm27_text(
    header: &Tm27Header,
    quantity: Tm27Quantity,
    wavelengths_nm: &[f64],
    power_per_nm: &[f64],
) -> std::io::Result<String> {
    let mut writer = Writer::new_with_indent(Vec::new(), b' ', 1);
    writer.write_event(Event::Decl(BytesDecl::new("1.0", Some("UTF-8"), None)))?;
    let mut root = BytesStart::new("IESTM2714");
    root.push_attribute(("xmlns", "http://www.ies.org/iestm2714"));
    root.push_attribute(("version", "1.0"));
    writer.write_event(Event::Start(root))?;
    writer.write_event(Event::Start(BytesStart::new("Header")))?;
    let parts = [
        ("Description", &header.description, true),
        ("DocumentCreator", &header.document_creator, true),
        ("DocumentCreationDate", &header.document_creation_date, true),
        ("Comments", &header.comments, false),
    ];
    for (name, text, required) in parts {
        if required || !text.is_empty() {
            element(&mut writer, BytesStart::new(name), text)?;
        }
    }
    writer.write_event(Event::End(BytesEnd::new("Header")))?;
    writer.write_event(Event::Start(BytesStart::new("SpectralDistribution")))?;
    element(&mut writer, BytesStart::new("SpectralQuantity"), quantity.word())?;
    for (nm, value) in wavelengths_nm.iter().zip(power_per_nm) {
        let mut start = BytesStart::new("SpectralData");
        start.push_attribute(("wavelength", nm.to_string().as_str()));
        element(&mut writer, start, &value.to_string())?;
    }
    writer.write_event(Event::End(BytesEnd::new("SpectralDistribution")))?;
    writer.write_event(Event::End(BytesEnd::new("IESTM2714")))?;
    let mut text = String::from_utf8(writer.into_inner()).map_err(std::io::Error::other)?;
    text.push('\n');
    Ok(text)
}

fn element(writer: &mut Writer<Vec<u8>>, start: BytesStart<'_>, text: &str) -> std::io::Result<()> {
    let end = start.to_end().into_owned();
    let text: String = text.chars().filter(|&c| !c.is_control() || matches!(c, '\t' | '\n')).collect();
    writer.write_event(Event::Start(start))?;
    writer.write_event(Event::Text(BytesText::new(&text)))?;
    writer.write_event(Event::End(end))
}
