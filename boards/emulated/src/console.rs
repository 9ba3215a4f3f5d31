//! Console, files and exit status: the emulator's on a board, the operating system's on the host.
//!
//! Numbers are printed by hand: the formatting of `core` would be most of a small board's flash.

/// Ends the program with this exit status.
pub fn exit(status: i32) -> ! {
    #[cfg(target_os = "none")]
    semihosting::process::exit(status);
    #[cfg(not(target_os = "none"))]
    std::process::exit(status)
}

/// Says what went wrong and at which address, and ends the program with failure.
pub fn fail_at(what: &str, address: u32) -> ! {
    text(what);
    text(" at 0x");
    hexadecimal(address.into(), 8);
    text("\n");
    exit(1)
}

/// Says what went wrong and ends the program with failure.
pub fn fail(what: &str) -> ! {
    text(what);
    text("\n");
    exit(1)
}

/// The value, or the end of the program with what went wrong.
pub fn must<T, E: core::error::Error>(result: Result<T, E>, what: &str) -> T {
    match result {
        Ok(value) => value,
        Err(error) => {
            #[cfg(target_os = "none")]
            semihosting::println!("{what}: {error}");
            #[cfg(not(target_os = "none"))]
            println!("{what}: {error}");
            exit(1)
        }
    }
}

/// Prints text.
pub fn text(text: &str) {
    #[cfg(target_os = "none")]
    {
        use semihosting::io::Write;
        let written = semihosting::io::stdout().and_then(|mut out| out.write_all(text.as_bytes()));
        if written.is_err() {
            exit(1);
        }
    }
    #[cfg(not(target_os = "none"))]
    print!("{text}");
}

/// Prints text, then spaces up to `width` characters.
pub fn left(shown: &str, width: usize) {
    text(shown);
    for _ in shown.len()..width {
        text(" ");
    }
}

/// Prints a number in decimal, right-aligned in `width` characters.
pub fn decimal(number: u64, width: usize) {
    digits(number, 10, width, b' ');
}

/// Prints a number in hexadecimal with `width` digits.
pub fn hexadecimal(number: u64, width: usize) {
    digits(number, 16, width, b'0');
}

/// Prints tenths as a decimal with one place, right-aligned in `width` characters.
pub fn tenths(number: u64, width: usize) {
    decimal(number / 10, width.saturating_sub(2));
    text(".");
    decimal(number % 10, 1);
}

fn digits(mut number: u64, base: u64, width: usize, fill: u8) {
    let mut buffer = [fill; 24];
    let mut at = buffer.len();
    loop {
        at -= 1;
        buffer[at] = b"0123456789abcdef"[(number % base) as usize];
        number /= base;
        if number == 0 {
            break;
        }
    }
    let from = at.min(buffer.len() - width.min(buffer.len()));
    if let Ok(shown) = core::str::from_utf8(&buffer[from..]) {
        text(shown);
    }
}

/// Reads the whole file `name` of the working directory into `buffer`; what it holds.
pub fn read<'a>(name: &core::ffi::CStr, buffer: &'a mut [u8]) -> &'a [u8] {
    #[cfg(target_os = "none")]
    {
        use semihosting::io::Read;
        let Ok(mut file) = semihosting::fs::File::open(name) else {
            fail("the input file cannot be opened");
        };
        let mut length = 0;
        while length < buffer.len() {
            match file.read(&mut buffer[length..]) {
                Ok(0) => return &buffer[..length],
                Ok(more) => length += more,
                Err(_) => fail("the input file cannot be read"),
            }
        }
        fail("the input file is larger than the buffer")
    }
    #[cfg(not(target_os = "none"))]
    {
        let Some(bytes) = name.to_str().ok().and_then(|name| std::fs::read(name).ok()) else {
            fail("the input file cannot be read");
        };
        let Some(kept) = buffer.get_mut(..bytes.len()) else {
            fail("the input file is larger than the buffer");
        };
        kept.copy_from_slice(&bytes);
        kept
    }
}

/// Writes the whole file `name` into the working directory.
pub fn write(name: &core::ffi::CStr, bytes: &[u8]) {
    #[cfg(target_os = "none")]
    let written = semihosting::fs::write(name, bytes).is_ok();
    #[cfg(not(target_os = "none"))]
    let written = name.to_str().is_ok_and(|name| std::fs::write(name, bytes).is_ok());
    if !written {
        fail("the output file cannot be written");
    }
}
