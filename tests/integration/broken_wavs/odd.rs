//! Files that must be read, and what is in them.

use super::make::*;

pub struct Good {
    pub name: &'static str,
    pub bytes: Vec<u8>,
    pub channels: Vec<Vec<f64>>,
    pub rate: u32,
    pub bits: u16,
    pub float: bool,
    /// A word of each note expected.
    pub notes: &'static [&'static str],
}

pub fn good() -> Vec<Good> {
    let mut cases = Vec::new();
    let mut add = |name, bytes, channels: &[&[f64]], rate, bits, float, notes| {
        cases.push(Good {
            name,
            bytes,
            channels: channels.iter().map(|c| c.to_vec()).collect(),
            rate,
            bits,
            float,
            notes,
        });
    };
    let data = || chunk(b"data", &three());

    add("16 bit", plain(), &[&THREE], 48_000, 16, false, &[]);
    for rate in [8_000, 11_025, 44_100, 96_000, 192_000] {
        let head = chunk(b"fmt ", &fmt(PCM, 1, rate, 2, 16));
        add(
            "a usual rate",
            file(&[head, data()]),
            &[&THREE],
            rate,
            16,
            false,
            &[],
        );
    }
    add(
        "8 bit, offset binary, odd length, padded",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 1, 8)),
            chunk(b"data", &[0, 128, 192]),
        ]),
        &[&[-1.0, 0.0, 0.5]],
        48_000,
        8,
        false,
        &[],
    );
    add(
        "24 bit",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 3, 24)),
            chunk(b"data", &integers(&[1, -1, -0x80_0000, 0x40_0000], 3)),
        ]),
        &[&[1.0 / 8_388_608.0, -1.0 / 8_388_608.0, -1.0, 0.5]],
        48_000,
        24,
        false,
        &[],
    );
    let extended =
        |content: Vec<u8>, more: &[u8]| chunk(b"fmt ", &[content, more.to_vec()].concat());
    add(
        "32 bit behind an 18-byte format chunk",
        file(&[
            extended(fmt(PCM, 1, 48_000, 4, 32), &[0, 0]),
            chunk(b"data", &integers(&[1, -1 << 31, 1 << 30], 4)),
        ]),
        &[&[1.0 / 2_147_483_648.0, -1.0, 0.5]],
        48_000,
        32,
        false,
        &[],
    );
    add(
        "a 20-byte format chunk",
        file(&[extended(fmt(PCM, 1, 48_000, 2, 16), &[0, 0, 7, 7]), data()]),
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    let float32: Vec<u8> = [0.25f32, -1.5]
        .iter()
        .flat_map(|v| v.to_le_bytes())
        .collect();
    let float64: Vec<u8> = [0.1f64, -1.5]
        .iter()
        .flat_map(|v| v.to_le_bytes())
        .collect();
    add(
        "32-bit float, beyond full scale",
        file(&[
            chunk(b"fmt ", &fmt(FLOAT, 1, 48_000, 4, 32)),
            chunk(b"fact", &2u32.to_le_bytes()),
            chunk(b"data", &float32),
        ]),
        &[&[0.25, -1.5]],
        48_000,
        32,
        true,
        &[],
    );
    add(
        "32-bit float behind a 40-byte format chunk and a long fact chunk",
        file(&[
            extended(fmt(FLOAT, 1, 48_000, 4, 32), &[0; 24]),
            chunk(b"fact", &[0; 12]),
            chunk(b"data", &float32),
        ]),
        &[&[0.25, -1.5]],
        48_000,
        32,
        true,
        &[],
    );
    add(
        "64-bit float",
        file(&[
            chunk(b"fmt ", &fmt(FLOAT, 1, 48_000, 8, 64)),
            chunk(b"data", &float64),
        ]),
        &[&[0.1, -1.5]],
        48_000,
        64,
        true,
        &[],
    );
    add(
        "64-bit float, extensible",
        file(&[
            chunk(b"fmt ", &fmt_extensible(FLOAT, 1, 48_000, 8, 64)),
            chunk(b"data", &float64),
        ]),
        &[&[0.1, -1.5]],
        48_000,
        64,
        true,
        &[],
    );
    add(
        "24 bits at the top of 32, as the rule is",
        file(&[
            chunk(b"fmt ", &fmt_extensible(PCM, 1, 48_000, 4, 24)),
            chunk(b"data", &integers(&[0x100, -0x100, 0x4000_0000], 4)),
        ]),
        &[&[1.0 / 8_388_608.0, -1.0 / 8_388_608.0, 0.5]],
        48_000,
        24,
        false,
        &[],
    );
    add(
        "24 bits at the bottom of 32, against the rule",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 4, 24)),
            chunk(b"data", &integers(&[1, -1, 0x40_0000], 4)),
        ]),
        &[&[1.0 / 8_388_608.0, -1.0 / 8_388_608.0, 0.5]],
        48_000,
        24,
        false,
        &["bottom"],
    );
    add(
        "20 bits promised in 24, all 24 in use",
        file(&[
            chunk(b"fmt ", &fmt_extensible(PCM, 1, 48_000, 3, 20)),
            chunk(b"data", &integers(&[1, 0x40_0000], 3)),
        ]),
        &[&[1.0 / 8_388_608.0, 0.5]],
        48_000,
        20,
        false,
        &["all 24 are in use"],
    );
    add(
        "12 bits in 16",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 2, 12)),
            chunk(b"data", &integers(&[0x10, -0x8000], 2)),
        ]),
        &[&[1.0 / 2048.0, -1.0]],
        48_000,
        12,
        false,
        &[],
    );
    add(
        "20 bits in 24",
        file(&[
            chunk(b"fmt ", &fmt_extensible(PCM, 1, 48_000, 3, 20)),
            chunk(b"data", &integers(&[0x10, -0x80_0000], 3)),
        ]),
        &[&[1.0 / 524_288.0, -1.0]],
        48_000,
        20,
        false,
        &[],
    );
    add(
        "36 bits in 40",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 5, 36)),
            chunk(b"data", &integers(&[0x10, -1 << 39], 5)),
        ]),
        &[&[1.0 / (1u64 << 35) as f64, -1.0]],
        48_000,
        36,
        false,
        &[],
    );
    add(
        "64-bit integers",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 8, 64)),
            chunk(b"data", &integers(&[1 << 62, i64::MIN], 8)),
        ]),
        &[&[0.5, -1.0]],
        48_000,
        64,
        false,
        &[],
    );
    add(
        "stereo",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 2, 44_100, 2, 16)),
            chunk(b"data", &integers(&[0x4000, -0x4000, 0x2000, -0x2000], 2)),
        ]),
        &[&[0.5, 0.25], &[-0.5, -0.25]],
        44_100,
        16,
        false,
        &[],
    );
    add(
        "five channels, one frame",
        file(&[
            chunk(b"fmt ", &fmt_extensible(PCM, 5, 48_000, 2, 16)),
            chunk(b"data", &integers(&[0, 0x1000, 0x2000, 0x4000, -0x8000], 2)),
        ]),
        &[&[0.0], &[0.125], &[0.25], &[0.5], &[-1.0]],
        48_000,
        16,
        false,
        &[],
    );
    add(
        "an odd chunk with its pad byte before the format",
        file(&[
            chunk(b"LIST", b"odd"),
            mono16(),
            chunk(b"note", b"x"),
            data(),
        ]),
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    add(
        "chunks after the samples",
        file(&[mono16(), data(), chunk(b"LIST", b"INFO")]),
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    let mut wrong_byte_rate = plain();
    wrong_byte_rate[28..32].copy_from_slice(&7u32.to_le_bytes());
    add(
        "a wrong byte rate",
        wrong_byte_rate,
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    let mut wrong_size = plain();
    wrong_size[4..8].copy_from_slice(&0u32.to_le_bytes());
    add(
        "a RIFF size of zero",
        wrong_size,
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    for size in [0, u32::MAX] {
        add(
            "a stream, its length unknown",
            file(&[mono16(), chunk_of_size(b"data", size, &three())]),
            &[&THREE],
            48_000,
            16,
            false,
            &["does not say how long"],
        );
    }
    add(
        "a stream cut inside a frame",
        file(&[
            mono16(),
            chunk_of_size(b"data", u32::MAX, &[three(), vec![9]].concat()),
        ]),
        &[&THREE],
        48_000,
        16,
        false,
        &["does not say how long", "no whole frame"],
    );
    add(
        "a data chunk that ends inside a frame",
        file(&[mono16(), chunk(b"data", &[three(), vec![9]].concat())]),
        &[&THREE],
        48_000,
        16,
        false,
        &["no whole frame"],
    );
    add(
        "two format chunks",
        file(&[mono16(), chunk(b"fmt ", &fmt(PCM, 2, 8_000, 1, 8)), data()]),
        &[&THREE],
        48_000,
        16,
        false,
        &["second format"],
    );
    let ds64 = |size: u64| {
        let mut content = vec![0; 28];
        content[8..16].copy_from_slice(&size.to_le_bytes());
        chunk(b"ds64", &content)
    };
    for start in [b"RF64", b"BW64"] {
        add(
            "64-bit sizes",
            file_as(
                start,
                &[
                    ds64(6),
                    mono16(),
                    chunk_of_size(b"data", u32::MAX, &three()),
                    chunk(b"LIST", b"INFO"),
                ],
            ),
            &[&THREE],
            48_000,
            16,
            false,
            &[],
        );
    }
    add(
        "64-bit sizes that were never filled in",
        file_as(
            b"RF64",
            &[
                ds64(0),
                mono16(),
                chunk_of_size(b"data", u32::MAX, &three()),
            ],
        ),
        &[&THREE],
        48_000,
        16,
        false,
        &["does not say how long"],
    );
    cases
}
