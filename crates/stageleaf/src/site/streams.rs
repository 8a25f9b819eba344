//! The wasm sorted by what its bytes mean: instructions apart from variables, addresses, numbers and calls.
//!
//! A compressor finds more repeats within each kind than in the mixture: a tenth less to load. `unpack.js` puts the
//! bytes back in their order; both sides read the same table of [`shapes`].
//!
//! # Source
//! WebAssembly Core Specification 2.0, chapter 5 "Binary Format"; from memory.

use std::ops::Range;

use super::Failure;

/// Where bytes go; the order in the text.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Stream {
    /// All but the functions' bodies, as it stands.
    Sections,
    /// Declarations of variables.
    Locals,
    /// Instructions, with what nearly always follows from them: block types, alignments, globals.
    Code,
    Variables,
    /// Offsets of loads and stores.
    Offsets,
    /// Constants of one or two bytes.
    Numbers,
    /// Longer ones, mostly addresses of texts.
    Addresses,
    /// Constants of 64 bits.
    Wide,
    Floats,
    Branches,
    /// Branch tables and indirect calls.
    Tables,
    Calls,
}

const STREAMS: usize = 12;
/// Stands for `i32.const` whose number goes to [`Stream::Addresses`]: a code that the specification leaves free.
const LONG_CONST: u8 = 0xe0;
const I32_CONST: u8 = 0x41;
const END: u8 = 0x0b;

/// For every instruction a letter: what follows it. `unpack.js` knows the same letters.
pub fn shapes() -> String {
    (0..=u8::MAX).map(shape).collect()
}

const fn shape(code: u8) -> char {
    match code {
        // Blocks open; what ends one closes it.
        0x02..=0x04 => '{',
        END => '}',
        0x0c | 0x0d => 'b',
        0x0e => 't',
        0x10 | 0x12 | 0xd2 => 'c',
        0x11 | 0x13 => 'd',
        0x1c => 's',
        0x20..=0x22 => 'v',
        0x23..=0x26 | 0x3f | 0x40 | 0xd0 => 'o',
        0x28..=0x3e => 'm',
        I32_CONST => 'n',
        LONG_CONST => 'p',
        0x42 => 'w',
        0x43 => '4',
        0x44 => '8',
        0xfc => 'x',
        0xfd => 'y',
        0x00 | 0x01 | 0x05 | 0x0f | 0x1a | 0x1b | 0x45..=0xc4 | 0xd1 => '.',
        // Exceptions, garbage collection, threads: not made by this compiler for this target.
        _ => '?',
    }
}

/// The streams one after another, with their lengths.
pub struct Sorted {
    /// All bytes.
    pub bytes: Vec<u8>,
    /// How many belong to each stream.
    pub lengths: [usize; STREAMS],
    /// How many bytes before the first function's body.
    pub head: usize,
}

/// Sorts a wasm module.
///
/// # Errors
/// An instruction that is not known here.
pub fn sort(wasm: &[u8]) -> Result<Sorted, Failure> {
    let mut sorter = Sorter { wasm, at: 8, streams: Default::default() };
    let mut head = None;
    sorter.keep(0..8.min(wasm.len()));
    while sorter.at < wasm.len() {
        let start = sorter.at;
        let section = sorter.byte()?;
        let size = sorter.number()?;
        let end = sorter.at + size;
        if end > wasm.len() {
            return Err("the wasm ends too early".to_owned());
        }
        if section == 10 {
            let functions = sorter.number()?;
            sorter.keep(start..sorter.at);
            head = Some(sorter.streams[Stream::Sections as usize].len());
            for _ in 0..functions {
                sorter.function()?;
            }
        } else {
            sorter.keep(start..end);
        }
        if sorter.at != end && section == 10 {
            return Err("the wasm's code does not end where its section ends".to_owned());
        }
        sorter.at = end;
    }
    let head = head.ok_or("the wasm has no code")?;
    Ok(Sorted { lengths: sorter.streams.each_ref().map(Vec::len), bytes: sorter.streams.concat(), head })
}

struct Sorter<'a> {
    wasm: &'a [u8],
    at: usize,
    streams: [Vec<u8>; STREAMS],
}

impl Sorter<'_> {
    fn keep(&mut self, range: Range<usize>) {
        self.streams[Stream::Sections as usize].extend(&self.wasm[range]);
    }

    fn byte(&mut self) -> Result<u8, Failure> {
        let byte = self.wasm.get(self.at).copied().ok_or("the wasm ends too early")?;
        self.at += 1;
        Ok(byte)
    }

    /// A number in LEB128, of 64 bits and so ten bytes at most.
    fn number(&mut self) -> Result<usize, Failure> {
        let (mut number, mut shift) = (0, 0);
        loop {
            let byte = self.byte()?;
            number |= usize::from(byte & 127) << shift;
            shift += 7;
            if byte < 128 || shift > 63 {
                return Ok(number);
            }
        }
    }

    fn bytes(&mut self, stream: Stream, count: usize) -> Result<(), Failure> {
        for _ in 0..count {
            let byte = self.byte()?;
            self.streams[stream as usize].push(byte);
        }
        Ok(())
    }

    /// Moves a number to its stream.
    fn moved(&mut self, stream: Stream) -> Result<usize, Failure> {
        let start = self.at;
        let number = self.number()?;
        self.streams[stream as usize].extend(&self.wasm[start..self.at]);
        Ok(number)
    }

    fn memory(&mut self) -> Result<(), Failure> {
        if self.moved(Stream::Code)? >= 64 {
            return Err("the wasm has several memories".to_owned());
        }
        self.moved(Stream::Offsets).map(drop)
    }

    fn function(&mut self) -> Result<(), Failure> {
        let size = self.number()?;
        let end = self.at + size;
        for _ in 0..self.moved(Stream::Locals)? {
            self.moved(Stream::Locals)?;
            self.bytes(Stream::Locals, 1)?;
        }
        let mut depth = 1;
        while depth > 0 {
            let code = self.byte()?;
            let place = self.streams[Stream::Code as usize].len();
            self.streams[Stream::Code as usize].push(code);
            let mut all = |streams: &[Stream]| streams.iter().try_for_each(|s| self.moved(*s).map(drop));
            match shape(code) {
                '.' => {}
                '}' => depth -= 1,
                '{' => {
                    depth += 1;
                    all(&[Stream::Code])?;
                }
                'b' => all(&[Stream::Branches])?,
                't' => {
                    for _ in 0..=self.moved(Stream::Tables)? {
                        self.moved(Stream::Tables)?;
                    }
                }
                'c' => all(&[Stream::Calls])?,
                'd' => all(&[Stream::Tables, Stream::Tables])?,
                's' => {
                    for _ in 0..self.moved(Stream::Code)? {
                        self.moved(Stream::Code)?;
                    }
                }
                'v' => all(&[Stream::Variables])?,
                'o' => all(&[Stream::Code])?,
                'm' => self.memory()?,
                'n' => {
                    let start = self.at;
                    self.number()?;
                    let long = self.at - start > 2;
                    self.at = start;
                    if long {
                        self.streams[Stream::Code as usize][place] = LONG_CONST;
                    }
                    self.moved(if long { Stream::Addresses } else { Stream::Numbers })?;
                }
                'w' => all(&[Stream::Wide])?,
                '4' => self.bytes(Stream::Floats, 4)?,
                '8' => self.bytes(Stream::Floats, 8)?,
                'x' => {
                    let more = self.moved(Stream::Code)?;
                    let count = BULK.as_bytes().get(more).ok_or("the wasm has an instruction unknown here")?;
                    for _ in 0..count - b'0' {
                        self.moved(Stream::Code)?;
                    }
                }
                'y' => match self.moved(Stream::Code)? {
                    0..=11 | 92 | 93 => self.memory()?,
                    84..=91 => {
                        self.memory()?;
                        self.bytes(Stream::Code, 1)?;
                    }
                    12 => self.bytes(Stream::Floats, 16)?,
                    13 => self.bytes(Stream::Code, 16)?,
                    21..=34 => self.bytes(Stream::Code, 1)?,
                    256.. => return Err("the wasm has a vector instruction unknown here".to_owned()),
                    _ => {}
                },
                _ => return Err(format!("the wasm has an instruction unknown here: {code:#x}")),
            }
        }
        if self.at == end { Ok(()) } else { Err("a function of the wasm does not end where it says".to_owned()) }
    }
}

/// How many numbers follow the instructions behind 0xfc: conversions, then those on whole ranges of memory and tables.
pub const BULK: &str = "000000002121212111";

#[cfg(test)]
mod tests {
    use super::*;

    /// One function: `local i64`, then `i32.const 5`, `i32.const 300000`, `i32.load offset=8`, `drop`, `end`.
    const MODULE: &[u8] =
        b"\0asm\x01\0\0\0\x0a\x14\x01\x12\x01\x01\x7e\x41\x05\x1a\x41\xe0\xa7\x12\x28\x02\x08\x1a\x42\x01\x1a\x0b\x00\x03\x01a!";

    #[test]
    fn bytes_go_where_their_meaning_is() {
        let sorted = sort(MODULE).unwrap();
        let mut rest = &sorted.bytes[..];
        let streams = sorted.lengths.map(|length| {
            let (stream, after) = rest.split_at(length);
            rest = after;
            stream
        });
        assert_eq!(sorted.head, 11);
        assert_eq!(streams[Stream::Sections as usize], b"\0asm\x01\0\0\0\x0a\x14\x01\x00\x03\x01a!");
        assert_eq!(streams[Stream::Locals as usize], [1, 1, 0x7e]);
        assert_eq!(streams[Stream::Code as usize], [0x41, 0x1a, LONG_CONST, 0x28, 2, 0x1a, 0x42, 0x1a, 0x0b]);
        assert_eq!(streams[Stream::Numbers as usize], [5]);
        assert_eq!(streams[Stream::Addresses as usize], [0xe0, 0xa7, 0x12]);
        assert_eq!(streams[Stream::Offsets as usize], [8]);
        assert_eq!(streams[Stream::Wide as usize], [1]);
        assert!(rest.is_empty());
    }

    #[test]
    fn what_is_not_known_is_refused() {
        let mut strange = MODULE.to_vec();
        strange[17] = 0xfe;
        assert!(sort(&strange).is_err_and(|words| words.contains("0xfe")));
        assert!(sort(&MODULE[..20]).is_err());
        assert!(sort(b"\0asm\x01\0\0\0").is_err());
    }
}
