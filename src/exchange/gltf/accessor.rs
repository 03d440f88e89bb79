//! Accessors: typed numbers in buffers (glTF 2.0, sections 3.6.2 and 3.11).

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use super::buffers::Buffers;
use super::error::GltfError;
use super::json::At;

/// Bytes of memory that the numbers of a document may take for each byte of its own, and beyond. Overlapping accessors and
/// sparse ones over zeros can ask for any amount; honest floats take twice theirs.
const MOST_TIMES: usize = 6;
const SPARE_BYTES: usize = 16 << 20;

/// How one number is stored.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Component {
    /// Signed, one byte.
    I8,
    /// Unsigned, one byte.
    U8,
    /// Signed, two bytes.
    I16,
    /// Unsigned, two bytes.
    U16,
    /// Unsigned, four bytes.
    U32,
    /// A float of four bytes.
    F32,
}

impl Component {
    fn from_code(code: usize) -> Option<Self> {
        Some(match code {
            5120 => Self::I8,
            5121 => Self::U8,
            5122 => Self::I16,
            5123 => Self::U16,
            5125 => Self::U32,
            5126 => Self::F32,
            _ => return None,
        })
    }

    const fn size(self) -> usize {
        match self {
            Self::I8 | Self::U8 => 1,
            Self::I16 | Self::U16 => 2,
            Self::U32 | Self::F32 => 4,
        }
    }

    /// The stored number itself, from exactly [`Component::size`] bytes.
    fn stored(self, bytes: &[u8]) -> f64 {
        let whole = match *bytes {
            [a] => u32::from(a),
            [a, b] => u32::from(u16::from_le_bytes([a, b])),
            [a, b, c, d] => u32::from_le_bytes([a, b, c, d]),
            _ => 0,
        };
        match self {
            Self::I8 => f64::from(whole as u8 as i8),
            Self::I16 => f64::from(whole as u16 as i16),
            Self::U8 | Self::U16 | Self::U32 => f64::from(whole),
            Self::F32 => f64::from(f32::from_bits(whole)),
        }
    }

    /// A stored number as the standard's table of section 3.11 turns it into a float. The quotient is rounded to 32 bits,
    /// so that a key written back as a float is the key that was read.
    fn normalised(self, stored: f64) -> f64 {
        let ratio = |largest: f64| f64::from((stored / largest) as f32);
        match self {
            Self::I8 => ratio(127.0).max(-1.0),
            Self::U8 => ratio(255.0),
            Self::I16 => ratio(32767.0).max(-1.0),
            Self::U16 => ratio(65535.0),
            Self::U32 | Self::F32 => stored,
        }
    }
}

/// What a user of an accessor expects it to hold.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Wanted {
    /// The `type`.
    pub kind: &'static str,
    /// Numbers in an element.
    pub components: usize,
    /// Whether normalised integers will do.
    pub integers: bool,
}

/// The numbers of an accessor, element after element.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Decoded {
    /// All of them.
    pub numbers: Vec<f64>,
    /// How they were stored.
    pub component: Component,
    /// Whether it has neither a view nor sparse values, and so is all zeros.
    pub all_zero: bool,
}

/// Rotations of an accessor as the small whole numbers that they are stored as.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Whole {
    /// Element after element.
    pub numbers: Vec<i16>,
    /// The number that stands for 1.
    pub one: i16,
    /// How they were stored.
    pub component: Component,
    /// As in [`Decoded`].
    pub all_zero: bool,
}

/// Reads accessors, and keeps count of the memory that it hands out.
pub(super) struct Accessors<'a> {
    root: At<'a>,
    /// Where the bytes are.
    pub buffers: Buffers<'a>,
    file_bytes: usize,
    handed_out_bytes: usize,
}

impl<'a> Accessors<'a> {
    /// Over the buffers of a file of `file_bytes` bytes.
    pub(super) fn new(root: At<'a>, buffers: Buffers<'a>, file_bytes: usize) -> Self {
        Self { root, buffers, file_bytes, handed_out_bytes: 0 }
    }

    /// Whether the document is so large that what is made of its smallest numbers counts.
    pub(super) fn are_large(&self) -> bool {
        self.file_bytes.saturating_add(self.buffers.opened_bytes) > SPARE_BYTES / 2
    }

    /// How many elements an accessor says it has.
    pub(super) fn count(&self, index: usize) -> Result<usize, GltfError> {
        let accessor = self.root.element("accessors", index)?;
        match accessor.needed_whole("count")? {
            0 => Err(GltfError::unlike(accessor.path_of("count"), "1 or more", "0")),
            count => Ok(count),
        }
    }

    /// All numbers of an accessor, normalised where they are integers. Each is counted as taking `number_bytes` in the end.
    pub(super) fn decode(
        &mut self,
        index: usize,
        wanted: Wanted,
        number_bytes: usize,
    ) -> Result<Decoded, GltfError> {
        let accessor = self.root.element("accessors", index)?;
        let component = checked_component(&accessor, wanted)?;
        let mut numbers = self.numbers(&accessor, index, wanted, number_bytes, |stored| stored)?;
        for number in &mut numbers {
            *number = component.normalised(*number);
        }
        Ok(Decoded { numbers, component, all_zero: is_all_zero(&accessor) })
    }

    /// The numbers of an accessor of small integers as they are stored; `None` where it has others.
    pub(super) fn decode_whole(&mut self, index: usize, wanted: Wanted) -> Result<Option<Whole>, GltfError> {
        let accessor = self.root.element("accessors", index)?;
        let component = checked_component(&accessor, wanted)?;
        let one = match component {
            Component::I8 => 127,
            Component::U8 => 255,
            Component::I16 => 32_767,
            Component::U16 | Component::U32 | Component::F32 => return Ok(None),
        };
        let numbers = self.numbers(&accessor, index, wanted, size_of::<i16>(), |stored| stored as i16)?;
        Ok(Some(Whole { numbers, one, component, all_zero: is_all_zero(&accessor) }))
    }

    /// All numbers of an accessor as they are stored, sparse ones put in.
    fn numbers<T: Copy + Default>(
        &mut self,
        accessor: &At<'_>,
        index: usize,
        wanted: Wanted,
        number_bytes: usize,
        of: impl Fn(f64) -> T,
    ) -> Result<Vec<T>, GltfError> {
        let component = component_of(accessor)?;
        let count = self.count(index)?;
        let total = count.saturating_mul(wanted.components);
        let view = accessor.index("bufferView", "bufferViews", &self.root)?;
        let mut numbers = if let Some(view) = view {
            let start = accessor.whole("byteOffset")?.unwrap_or(0);
            let shape = Shape { count, components: wanted.components, component, start };
            // Whether the bytes hold them is looked at before anything is set aside for the numbers.
            let (bytes, stride) = self.buffers.view(view)?;
            shape.elements(bytes, stride, &accessor.path, view)?;
            self.spend(total.saturating_mul(number_bytes), accessor)?;
            let (bytes, stride) = self.buffers.view(view)?;
            shape.read(shape.elements(bytes, stride, &accessor.path, view)?, &of)
        } else {
            self.spend(total.saturating_mul(number_bytes), accessor)?;
            vec![T::default(); total]
        };
        if let Some(sparse) = accessor.get("sparse") {
            self.substitute(&sparse, component, wanted.components, count, &mut numbers, &of)?;
        }
        Ok(numbers)
    }

    /// Counts bytes about to be handed out, and refuses a document that asks for far more of them than it has itself.
    fn spend(&mut self, bytes: usize, accessor: &At<'_>) -> Result<(), GltfError> {
        self.handed_out_bytes = self.handed_out_bytes.saturating_add(bytes);
        let own = self.file_bytes.saturating_add(self.buffers.opened_bytes);
        let most = own.saturating_mul(MOST_TIMES).saturating_add(SPARE_BYTES);
        if self.handed_out_bytes <= most {
            return Ok(());
        }
        Err(GltfError::unlike(
            accessor.path_of("count"),
            format!("at most {} MB of numbers in all animation of a document of {own} bytes", most >> 20),
            format!("{} MB up to here", self.handed_out_bytes >> 20),
        ))
    }

    /// Overwrites the elements that a sparse accessor lists (section 3.6.2.3).
    fn substitute<T: Copy>(
        &mut self,
        sparse: &At<'_>,
        component: Component,
        components: usize,
        count: usize,
        numbers: &mut [T],
        of: &impl Fn(f64) -> T,
    ) -> Result<(), GltfError> {
        let n_listed = sparse.needed_whole("count")?;
        if !(1..=count).contains(&n_listed) {
            let place = sparse.path_of("count");
            return Err(GltfError::unlike(place, format!("1 to {count}"), n_listed.to_string()));
        }
        let Some(indices) = sparse.get("indices") else { return Err(sparse.missing("indices", "an object")) };
        let Some(values) = sparse.get("values") else { return Err(sparse.missing("values", "an object")) };
        let index_kind = component_of(&indices)?;
        if !matches!(index_kind, Component::U8 | Component::U16 | Component::U32) {
            let found = indices.whole("componentType")?.unwrap_or_default().to_string();
            let place = indices.path_of("componentType");
            return Err(GltfError::unlike(place, "5121, 5123 or 5125", found));
        }
        let listed = self.tight(&indices, index_kind, 1, n_listed, &|stored| stored as u32)?;
        let replacements = self.tight(&values, component, components, n_listed, of)?;
        let mut before = None;
        for (at, (index, replacement)) in listed.iter().zip(replacements.chunks_exact(components)).enumerate()
        {
            let index = *index as usize;
            if index >= count || before.is_some_and(|before| index <= before) {
                let expected = format!("strictly rising indices below {count}");
                return Err(GltfError::unlike(indices.path, expected, format!("{index} at {at}")));
            }
            before = Some(index);
            let start = index.saturating_mul(components);
            if let Some(element) = numbers.get_mut(start..start.saturating_add(components)) {
                element.copy_from_slice(replacement);
            }
        }
        Ok(())
    }

    /// Numbers without gaps, where the view alone says where they are.
    fn tight<T>(
        &mut self,
        place: &At<'_>,
        component: Component,
        components: usize,
        count: usize,
        of: &impl Fn(f64) -> T,
    ) -> Result<Vec<T>, GltfError> {
        let view = place.needed_index("bufferView", "bufferViews", &self.root)?;
        let start = place.whole("byteOffset")?.unwrap_or(0);
        let shape = Shape { count, components, component, start };
        let (bytes, _) = self.buffers.view(view)?;
        Ok(shape.read(shape.elements(bytes, None, &place.path, view)?, of))
    }
}

fn is_all_zero(accessor: &At<'_>) -> bool {
    accessor.get("bufferView").is_none() && accessor.get("sparse").is_none()
}

/// The component type of an accessor, which has to hold what is wanted.
fn checked_component(accessor: &At<'_>, wanted: Wanted) -> Result<Component, GltfError> {
    let kind = accessor.text("type")?.unwrap_or_default();
    if kind != wanted.kind {
        let found = format!("`{kind}`");
        return Err(GltfError::unlike(accessor.path_of("type"), format!("`{}`", wanted.kind), found));
    }
    let component = component_of(accessor)?;
    match component {
        Component::F32 => Ok(component),
        Component::U32 => {
            Err(GltfError::unlike(accessor.path_of("componentType"), "5120 to 5123 or 5126", "5125"))
        }
        _ if !wanted.integers => {
            let found = accessor.whole("componentType")?.unwrap_or_default().to_string();
            Err(GltfError::unlike(accessor.path_of("componentType"), "5126 (float)", found))
        }
        _ if !accessor.is_set("normalized") => {
            let expected = "`normalized: true` beside an integer componentType";
            Err(GltfError::unlike(accessor.path_of("normalized"), expected, "none"))
        }
        _ => Ok(component),
    }
}

fn component_of(place: &At<'_>) -> Result<Component, GltfError> {
    let code = place.needed_whole("componentType")?;
    let expected = "5120 to 5123, 5125 or 5126";
    Component::from_code(code)
        .ok_or_else(|| GltfError::unlike(place.path_of("componentType"), expected, code.to_string()))
}

/// How elements lie in a view.
#[derive(Clone, Copy)]
struct Shape {
    count: usize,
    components: usize,
    component: Component,
    start: usize,
}

impl Shape {
    fn element_size(self) -> usize {
        self.components.saturating_mul(self.component.size())
    }

    /// The bytes that hold the elements, and the step from one to the next; checked to hold them all.
    fn elements<'b>(
        self,
        view_bytes: &'b [u8],
        stride: Option<usize>,
        place: &str,
        view: usize,
    ) -> Result<(&'b [u8], usize), GltfError> {
        let size = self.element_size();
        let stride = stride.unwrap_or(size);
        if stride < size {
            let place = format!("bufferViews[{view}].byteStride");
            return Err(GltfError::unlike(place, format!("{size} or more"), stride.to_string()));
        }
        let end = self
            .count
            .saturating_sub(1)
            .checked_mul(stride)
            .and_then(|last| last.checked_add(size))
            .and_then(|length| length.checked_add(self.start));
        if let Some(bytes) = end.and_then(|end| view_bytes.get(self.start..end)) {
            return Ok((bytes, stride));
        }
        let end = end.map_or_else(|| "more than can be counted".to_owned(), |end| end.to_string());
        let expected = format!("to fit into bufferViews[{view}] of {} bytes", view_bytes.len());
        Err(GltfError::unlike(place, expected, format!("{} elements up to byte {end}", self.count)))
    }

    /// The stored numbers of checked bytes.
    fn read<T>(self, (bytes, stride): (&[u8], usize), of: &impl Fn(f64) -> T) -> Vec<T> {
        let mut numbers = Vec::with_capacity(self.count.saturating_mul(self.components));
        for element in bytes.chunks(stride.max(1)) {
            let own = element.get(..self.element_size()).unwrap_or_default();
            numbers.extend(own.chunks_exact(self.component.size()).map(|one| of(self.component.stored(one))));
        }
        numbers
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn integers_follow_the_table_of_the_standard() {
        let check = |component: Component, bytes: &[u8], expected: f64| {
            assert_eq!(component.normalised(component.stored(bytes)), expected, "{component:?} {bytes:?}");
        };
        check(Component::I8, &[0x80], -1.0);
        check(Component::I8, &[0x81], -1.0);
        check(Component::I8, &[127], 1.0);
        check(Component::U8, &[51], f64::from(0.2_f32));
        check(Component::I16, &[0x00, 0x80], -1.0);
        check(Component::I16, &[0xFF, 0x7F], 1.0);
        check(Component::I16, &[0xFF, 0xFF], f64::from(-1.0_f32 / 32767.0));
        check(Component::U16, &[0xFF, 0xFF], 1.0);
        check(Component::F32, &1.5_f32.to_le_bytes(), 1.5);
    }
}
