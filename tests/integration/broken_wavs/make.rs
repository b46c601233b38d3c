//! Chunks and files, byte by byte.

pub const PCM: u16 = 1;
pub const FLOAT: u16 = 3;
pub const EXTENSIBLE: u16 = 0xFFFE;

/// One chunk, padded to an even length.
pub fn chunk(id: &[u8; 4], content: &[u8]) -> Vec<u8> {
    let mut bytes = chunk_of_size(id, content.len() as u32, content);
    if content.len() % 2 == 1 {
        bytes.push(0);
    }
    bytes
}

/// One chunk whose header states `size`, whatever is in it.
pub fn chunk_of_size(id: &[u8; 4], size: u32, content: &[u8]) -> Vec<u8> {
    let mut bytes = id.to_vec();
    bytes.extend(size.to_le_bytes());
    bytes.extend(content);
    bytes
}

/// Format chunk content of 16 bytes, consistent.
pub fn fmt(tag: u16, channels: u16, rate: u32, container_bytes: u16, bits: u16) -> Vec<u8> {
    let frame = channels * container_bytes;
    let mut bytes = Vec::new();
    bytes.extend(tag.to_le_bytes());
    bytes.extend(channels.to_le_bytes());
    bytes.extend(rate.to_le_bytes());
    bytes.extend(rate.wrapping_mul(u32::from(frame)).to_le_bytes());
    bytes.extend(frame.to_le_bytes());
    bytes.extend(bits.to_le_bytes());
    bytes
}

/// Extensible format chunk content, 40 bytes.
pub fn fmt_extensible(
    sub: u16,
    channels: u16,
    rate: u32,
    container_bytes: u16,
    valid: u16,
) -> Vec<u8> {
    let mut bytes = fmt(
        EXTENSIBLE,
        channels,
        rate,
        container_bytes,
        container_bytes * 8,
    );
    bytes.extend(22u16.to_le_bytes());
    bytes.extend(valid.to_le_bytes());
    bytes.extend(0u32.to_le_bytes());
    bytes.extend(sub.to_le_bytes());
    bytes.extend([0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xAA, 0, 0x38, 0x9B, 0x71]);
    bytes
}

/// A file of the given start, with the size field that belongs to it.
pub fn file_as(start: &[u8; 4], chunks: &[Vec<u8>]) -> Vec<u8> {
    let body = chunks.concat();
    let mut bytes = start.to_vec();
    bytes.extend((body.len() as u32 + 4).to_le_bytes());
    bytes.extend(b"WAVE");
    bytes.extend(body);
    bytes
}

pub fn file(chunks: &[Vec<u8>]) -> Vec<u8> {
    file_as(b"RIFF", chunks)
}

/// Three frames of 16-bit mono, 0.5, -0.5 and -1, as bytes.
pub fn three() -> Vec<u8> {
    [16_384i16, -16_384, -32_768]
        .iter()
        .flat_map(|v| v.to_le_bytes())
        .collect()
}

pub const THREE: [f64; 3] = [0.5, -0.5, -1.0];

pub fn mono16() -> Vec<u8> {
    chunk(b"fmt ", &fmt(PCM, 1, 48_000, 2, 16))
}

pub fn plain() -> Vec<u8> {
    file(&[mono16(), chunk(b"data", &three())])
}

/// Little-endian bytes of `values`, `width` bytes each.
pub fn integers(values: &[i64], width: usize) -> Vec<u8> {
    values
        .iter()
        .flat_map(|v| v.to_le_bytes()[..width].to_vec())
        .collect()
}
