//! EDF files built field by field, so that any of them can be wrong.

/// One signal as text.
#[derive(Clone)]
pub struct Signal {
    pub label: String,
    pub unit: String,
    pub physical: [String; 2],
    pub digital: [String; 2],
    pub samples: usize,
}

/// A file to be.
#[derive(Clone)]
pub struct Plan {
    pub reserved: String,
    pub records: String,
    pub duration: String,
    pub signals: Vec<Signal>,
    /// Bytes of each signal in each record.
    pub body: Vec<Vec<Vec<u8>>>,
}

/// A signal in steps of 1 µV.
pub fn signal(label: &str, samples: usize) -> Signal {
    Signal {
        label: label.to_owned(),
        unit: "uV".to_owned(),
        physical: ["-32768", "32767"].map(str::to_owned),
        digital: ["-32768", "32767"].map(str::to_owned),
        samples,
    }
}

/// A signal of text, `samples` two-byte places long.
pub fn text(samples: usize) -> Signal {
    Signal {
        physical: ["-1", "1"].map(str::to_owned),
        unit: String::new(),
        ..signal("EDF Annotations", samples)
    }
}

/// Digital value of a sample: all different, easy to foretell.
pub fn digital(signal: usize, sample: usize) -> i16 {
    ((signal * 1000 + sample) % 30_000) as i16
}

impl Plan {
    /// Signals that count upwards over `records` records of one second.
    pub fn new(signals: Vec<Signal>, records: usize) -> Plan {
        let part = |signal: usize, record: usize| -> Vec<u8> {
            let samples = signals[signal].samples;
            let all = record * samples..(record + 1) * samples;
            all.flat_map(|i| digital(signal, i).to_le_bytes()).collect()
        };
        let body = (0..records)
            .map(|r| (0..signals.len()).map(|s| part(s, r)).collect())
            .collect();
        Plan {
            reserved: String::new(),
            records: records.to_string(),
            duration: "1".to_owned(),
            signals,
            body,
        }
    }

    /// The same with annotation lists in the last signal, one text a record.
    pub fn with_lists(mut self, reserved: &str, lists: &[&str]) -> Plan {
        let signal = self.signals.len() - 1;
        self.reserved = reserved.to_owned();
        for (record, list) in lists.iter().enumerate() {
            self.write_list(record, signal, list);
        }
        self
    }

    /// Puts one text of lists into a record of a signal, filled with NUL.
    pub fn write_list(&mut self, record: usize, signal: usize, list: &str) {
        let mut bytes = list.as_bytes().to_vec();
        assert!(
            bytes.len() <= 2 * self.signals[signal].samples,
            "{list} is too long"
        );
        bytes.resize(2 * self.signals[signal].samples, 0);
        self.body[record][signal] = bytes;
    }

    pub fn header_bytes(&self) -> usize {
        256 * (1 + self.signals.len())
    }

    pub fn record_bytes(&self) -> usize {
        self.signals.iter().map(|s| 2 * s.samples).sum()
    }

    pub fn bytes(&self) -> Vec<u8> {
        let mut out = Vec::new();
        let mut put = |text: &str, width: usize| {
            assert!(text.len() <= width, "{text} is too long");
            out.extend(format!("{text:width$}").as_bytes());
        };
        put("0", 8);
        put("X X X X", 80);
        put("Startdate X X X X", 80);
        put("01.01.85", 8);
        put("00.00.00", 8);
        put(&self.header_bytes().to_string(), 8);
        put(&self.reserved, 44);
        put(&self.records, 8);
        put(&self.duration, 8);
        put(&self.signals.len().to_string(), 4);
        let s = &self.signals;
        s.iter().for_each(|s| put(&s.label, 16));
        s.iter().for_each(|_| put("", 80));
        s.iter().for_each(|s| put(&s.unit, 8));
        s.iter().for_each(|s| put(&s.physical[0], 8));
        s.iter().for_each(|s| put(&s.physical[1], 8));
        s.iter().for_each(|s| put(&s.digital[0], 8));
        s.iter().for_each(|s| put(&s.digital[1], 8));
        s.iter().for_each(|_| put("", 80));
        s.iter().for_each(|s| put(&s.samples.to_string(), 8));
        s.iter().for_each(|_| put("", 32));
        out.extend(self.body.iter().flatten().flatten());
        out
    }
}
