import { type Case, type CaseGroup, good, t } from './case.ts'

const reading = (signal: string, time: string, value: string) =>
  `{"signal":${signal},"time":${time},"value":${value}}`
/** A good line before and behind, to see that reading goes on. */
const between = (line: string) => `${good}\n${line}\n${good}\n`

const notJson = [
  ['an open brace', '{'],
  ['a closed brace', '}'],
  ['an object cut off in a key', '{"sig'],
  ['an object cut off behind a colon', '{"signal":'],
  ['an object cut off in a number', `{"signal":"A","time":${t},"value":12`],
  ['two objects on a line', good + good],
  ['two objects with a comma', `${good},${good}`],
  ['a trailing comma', `{"signal":"A","time":${t},"value":1,}`],
  ['a missing comma', `{"signal":"A" "time":${t},"value":1}`],
  ['a missing colon', `{"signal" "A","time":${t},"value":1}`],
  ['single quotation marks', `{'signal':'A','time':${t},'value':1}`],
  ['keys without quotation marks', `{signal:"A",time:${t},value:1}`],
  ['a comment', `{"signal":"A",/* */"time":${t},"value":1}`],
  ['a comment behind', `${good} // fine`],
  ['text', 'temperature is fine'],
  ['HTML', '<html><body>502 Bad Gateway</body></html>'],
  ['a line of a log', '2026-11-02 10:42:05 ERROR connection refused'],
  ['a value NaN', reading('"A"', `${t}`, 'NaN')],
  ['a value Infinity', reading('"A"', `${t}`, 'Infinity')],
  ['a value -Infinity', reading('"A"', `${t}`, '-Infinity')],
  ['a value with a leading zero', reading('"A"', `${t}`, '01.5')],
  ['a value with a leading plus', reading('"A"', `${t}`, '+1.5')],
  ['a value that begins with a point', reading('"A"', `${t}`, '.5')],
  ['a value that ends in a point', reading('"A"', `${t}`, '5.')],
  ['a value with two points', reading('"A"', `${t}`, '1.2.3')],
  ['a value with an empty exponent', reading('"A"', `${t}`, '1e')],
  ['a hexadecimal value', reading('"A"', `${t}`, '0x1F')],
  ['a value with digits in groups', reading('"A"', `${t}`, '1_000')],
  ['a value with a decimal comma', reading('"A"', `${t}`, '1,5')],
  ['a lone minus', reading('"A"', `${t}`, '-')],
  ['undefined', reading('"A"', `${t}`, 'undefined')],
  ['True with a capital', reading('"A"', `${t}`, 'True')],
  ['a tab within a text', reading('"A\tB"', `${t}`, '1')],
  ['a bad escape', reading('"A\\x41"', `${t}`, '1')],
  ['a cut Unicode escape', reading('"A\\u00"', `${t}`, '1')],
  ['a text that is not closed', `{"signal":"A,"time":${t},"value":1}`],
  ['a NUL byte in front', `\0${good}`],
  ['a NUL byte behind', `${good}\0`],
  ['a NUL byte inside', reading('"A\0"', `${t}`, '1')],
  ['only NUL bytes', '\0'.repeat(500)],
  ['a vertical tab as a blank', `{\v"signal":"A","time":${t},"value":1}`],
  ['a no-break space as a blank', `{\u00a0"signal":"A","time":${t},"value":1}`],
  ['a byte order mark in the middle of the file', `\ufeff${good}`],
  ['63,000 open brackets', '['.repeat(63_000)],
  ['63,000 open objects', '{"a":'.repeat(12_600)],
  ['arrays 1,000 deep, closed', '['.repeat(1000) + ']'.repeat(1000)],
  [
    'a reading that is buried 100 deep',
    `{"signal":"A","time":${t},"value":1,"x":${'['.repeat(100)}${']'.repeat(100)}}`,
  ],
  ['control characters', '\x01\x02\x1b[2J\x7f'],
] as const

const otherShape = [
  ['an empty object', '{}'],
  ['an empty array', '[]'],
  ['a number', '17'],
  ['a text', '"QUAY"'],
  ['null', 'null'],
  ['true', 'true'],
  ['an array around a reading', `[${good}]`],
  ['a reading one level down', `{"data":${good}}`],
  ['a missing signal', `{"time":${t},"value":1}`],
  ['a missing time', '{"signal":"A","value":1}'],
  ['a missing value', `{"signal":"A","time":${t}}`],
  ['keys in capitals', `{"Signal":"A","Time":${t},"Value":1}`],
  ['keys with a blank', `{"signal ":"A","time":${t},"value":1}`],
  ['a reading in the prototype', `{"__proto__":${good}}`],
  ['a constructor', '{"constructor":{"prototype":{"signal":"A"}},"time":1,"value":1}'],
] as const

const badTimes = [
  ['a time null', 'null'],
  ['a time true', 'true'],
  ['a time array', `[${t}]`],
  ['a time object', `{"ms":${t}}`],
  ['an empty time', '""'],
  ['a time in words', '"yesterday"'],
  ['epoch milliseconds as a text', `"${t}"`],
  ['year 0', '"0000-01-01T00:00:00Z"'],
  ['year 275760', '"+275760-09-13T00:00:00Z"'],
  ['the last time that Date knows', '8640000000000000'],
  ['beyond the last time that Date knows', '8640000000000001'],
  ['year 1', '"0001-01-01T00:00:00Z"'],
  ['year 9999', '"9999-12-31T23:59:59Z"'],
  ['the last millisecond of 1899', '-2208988800001'],
  ['the first millisecond of 2201', '7289654400000'],
  ['time 1e400', '1e400'],
  ['time -1e400', '-1e400'],
  ['time in nanoseconds', '1700000000000000000'],
  ['30 February', '"2026-02-30T00:00:00Z"'],
  ['29 February of a common year', '"2026-02-29"'],
  ['month 13', '"2026-13-01T00:00:00Z"'],
  ['hour 24', '"2026-11-02T24:00:00Z"'],
  ['minute 60', '"2026-11-02T10:60:00Z"'],
  ['an offset of 24 hours', '"2026-11-02T10:42:05+24:00"'],
  ['a time zone by name', '"2026-11-02T10:42:05 CET"'],
  ['an American date', '"11/02/2026 10:42:05"'],
  ['an ISO week', '"2026-W45-1"'],
  ['an ISO basic format', '"20261102T104205Z"'],
  ['digits of another script', '"２０２６-11-02T10:42:05Z"'],
  ['a time of 60,000 characters', `"${'2'.repeat(60_000)}"`],
] as const

const badValues = [
  ['1e400', '1e400'],
  ['-1e400', '-1e400'],
  ['1e999999', '1e999999'],
  ['a number of 400 digits', '9'.repeat(400)],
  ['null', 'null'],
  ['true', 'true'],
  ['a text', '"high"'],
  ['a number as a text', '"101.25"'],
  ['NaN as a text', '"NaN"'],
  ['an empty text', '""'],
  ['an array', '[1]'],
  ['an object', '{"v":1}'],
] as const

const badSignals = [
  ['a number', '17'],
  ['null', 'null'],
  ['an array', '["A"]'],
  ['an object', '{"name":"A"}'],
  ['empty', '""'],
  ['201 characters', `"${'x'.repeat(201)}"`],
  ['60,000 characters', `"${'x'.repeat(60_000)}"`],
  ['a line feed', '"A\\nB"'],
  ['a NUL', '"A\\u0000"'],
  ['an escape sequence of terminals', '"\\u001b[31mred"'],
  ['DEL', '"A\\u007f"'],
  ['a C1 control', '"A\\u0085"'],
  ['a lone high surrogate', '"A\\ud800"'],
  ['a lone low surrogate', '"\\udc00A"'],
  ['surrogates in the wrong order', '"\\udc00\\ud800"'],
  ['a replacement character', '"A\\ufffd"'],
] as const

const odd: readonly Case[] = [
  ['a negative price', reading('"A"', `${t}`, '-5'), { readings: 1 }],
  ['a price of zero', reading('"A"', `${t}`, '0'), { readings: 1 }],
  ['minus zero', reading('"A"', `${t}`, '-0'), { readings: 1 }],
  ['the smallest number', reading('"A"', `${t}`, '5e-324'), { readings: 1 }],
  ['less than the smallest number is zero', reading('"A"', `${t}`, '1e-400'), { readings: 1 }],
  ['the largest number', reading('"A"', `${t}`, '1.7976931348623157e308'), { readings: 1 }],
  ['a signal that nobody watches', reading('"NOBODY-WATCHES-ME"', `${t}`, '1'), { readings: 1 }],
  ['a signal called __proto__', reading('"__proto__"', `${t}`, '1'), { readings: 1 }],
  ['a signal called constructor', reading('"constructor"', `${t}`, '1'), { readings: 1 }],
  ['a signal of 200 characters', reading(`"${'x'.repeat(200)}"`, `${t}`, '1'), { readings: 1 }],
  ['a signal of Chinese characters', reading('"泵站"', `${t}`, '1'), { readings: 1 }],
  ['a pair of surrogates', reading('"\\ud83d\\udea2"', `${t}`, '1'), { readings: 1 }],
  [
    'duplicate keys: the last one counts',
    `{"value":null,"signal":5,"signal":"A","time":${t},"value":1}`,
    { readings: 1 },
  ],
  [
    'duplicate keys: the last one is bad',
    `{"value":1,"signal":"A","time":${t},"value":null}`,
    { 'bad-value': 1 },
  ],
  [
    'a member __proto__ besides',
    `{"__proto__":{"polluted":1},"signal":"A","time":${t},"value":1}`,
    { readings: 1 },
  ],
  [
    '5,000 members besides',
    `{${Array.from({ length: 5000 }, (_, i) => `"k${i}":${i}`).join(',')},${good.slice(1)}`,
    { readings: 1 },
  ],
  ['a huge array besides', `{"x":[${'1,'.repeat(20_000)}1],${good.slice(1)}`, { readings: 1 }],
  [
    'bytes that are no UTF-8 besides',
    Buffer.concat([Buffer.from('{"x":"'), Buffer.from([0xff, 0xc0]), Buffer.from(`",${good.slice(1)}`)]),
    { readings: 1 },
  ],
  [
    'bytes that are no UTF-8 in the signal',
    Buffer.concat([
      Buffer.from('{"signal":"A'),
      Buffer.from([0xff]),
      Buffer.from(`","time":${t},"value":1}`),
    ]),
    { 'bad-signal': 1 },
  ],
  [
    'a cut multibyte character in the signal',
    Buffer.concat([
      Buffer.from('{"signal":"A'),
      Buffer.from([0xe6, 0xbc]),
      Buffer.from(`","time":${t},"value":1}`),
    ]),
    { 'bad-signal': 1 },
  ],
  [
    'an overlong encoding in the signal',
    Buffer.concat([
      Buffer.from('{"signal":"'),
      Buffer.from([0xc1, 0x81]),
      Buffer.from(`","time":${t},"value":1}`),
    ]),
    { 'bad-signal': 1 },
  ],
  [
    'a surrogate encoded as UTF-8',
    Buffer.concat([
      Buffer.from('{"signal":"'),
      Buffer.from([0xed, 0xa0, 0x80]),
      Buffer.from(`","time":${t},"value":1}`),
    ]),
    { 'bad-signal': 1 },
  ],
  ['readings out of order and twice', between(reading('"QUAY"', `${t - 5}`, '1')) + good, { readings: 4 }],
  ['a time before 1970', reading('"A"', '-1', '1'), { readings: 1 }],
  ['a leap second', reading('"A"', '"2016-12-31T23:59:60Z"', '1'), { readings: 1 }],
]

const pointed: readonly Case[] = [
  ['pointers with ~0 and ~1', '{"a/b":{"c~d":["A"]},"t":1.7e9,"v":[0,{"":1}]}', { readings: 1 }],
  ['an index beyond the array', '{"a/b":{"c~d":[]},"t":1.7e9,"v":[0,{"":1}]}', { unreadable: 1 }],
  ['an object for the array', '{"a/b":{"c~d":{"0":"A"}},"t":1.7e9,"v":[0,{"":1}]}', { readings: 1 }],
  ['a text for the array', '{"a/b":{"c~d":"A"},"t":1.7e9,"v":[0,{"":1}]}', { unreadable: 1 }],
  ['null on the way', '{"a/b":null,"t":1.7e9,"v":[0,{"":1}]}', { unreadable: 1 }],
  ['an escaped key', '{"a\\u002fb":{"c\\u007ed":["A"]},"t":1.7e9,"v":[0,{"":1}]}', { readings: 1 }],
  ['seconds as a text', '{"a/b":{"c~d":["A"]},"t":"1700000000.5","v":[0,{"":1}]}', { readings: 1 }],
  [
    'RFC 3339 where seconds are stated',
    '{"a/b":{"c~d":["A"]},"t":"2026-11-02T10:42:05Z","v":[0,{"":1}]}',
    { 'bad-time': 1 },
  ],
  [
    'milliseconds where seconds are stated',
    `{"a/b":{"c~d":["A"]},"t":${t},"v":[0,{"":1}]}`,
    { 'bad-time': 1 },
  ],
]

const arrays: readonly Case[] = [
  ['no array there', '{"other":[]}', { unreadable: 1 }],
  ['an object for the array', '{"all":{"0":{"s":"A","t":1700000000000,"v":1}}}', { unreadable: 1 }],
  ['null for the array', '{"all":null}', { unreadable: 1 }],
  ['an empty array', '{"all":[]}', {}],
  [
    'good and bad elements',
    `{"all":[{"s":"A","t":${t},"v":1},7,null,[],"x",{"s":"A"},{"s":"B","t":${t},"v":2}]}`,
    { readings: 2, unreadable: 5 },
  ],
  ['20,000 nulls', `{"all":[${'null,'.repeat(12_000)}null]}`, { unreadable: 12_001 }],
  ['arrays in the array', `{"all":[[{"s":"A","t":${t},"v":1}]]}`, { unreadable: 1 }],
  ['an array cut off', `{"all":[{"s":"A","t":${t},"v":1}`, { unreadable: 1 }],
]

export const jsonGroups: readonly CaseGroup[] = [
  {
    title: 'NDJSON',
    format: 'ndjson',
    cases: [
      ...notJson.map(
        ([title, line]): Case => [`not JSON: ${title}`, between(line), { readings: 2, unreadable: 1 }],
      ),
      ...otherShape.map(
        ([title, line]): Case => [`another shape: ${title}`, between(line), { readings: 2, unreadable: 1 }],
      ),
      ...badTimes.map(
        ([title, time]): Case => [
          `a bad time: ${title}`,
          between(reading('"QUAY"', time, '1')),
          { readings: 2, 'bad-time': 1 },
        ],
      ),
      ...badValues.map(
        ([title, value]): Case => [
          `a bad value: ${title}`,
          between(reading('"QUAY"', `${t}`, value)),
          { readings: 2, 'bad-value': 1 },
        ],
      ),
      ...badSignals.map(
        ([title, signal]): Case => [
          `a bad signal: ${title}`,
          between(reading(signal, `${t}`, '1')),
          { readings: 2, 'bad-signal': 1 },
        ],
      ),
      ...odd.map(([title, content, expected]): Case => [`odd: ${title}`, content, expected]),
    ],
  },
  {
    title: 'JSON by pointers',
    format: { signal: '/a~1b/c~0d/0', time: '/t', value: '/v/1/', unit: 's' },
    cases: pointed,
  },
  {
    title: 'arrays of readings',
    format: { signal: '/s', time: '/t', value: '/v', unit: 'ms', readings: '/all' },
    cases: arrays,
  },
]
