import { type Case, type CaseGroup, t } from './case.ts'

const row = (text: string) => `time,signal,value\n${t},A,1\n${text}\n${t},A,2\n`
const rows: readonly (readonly [string, string, Case[2]])[] = [
  ['too few cells', `${t},A`, { readings: 2, unreadable: 1 }],
  ['too many cells', `${t},A,1,2`, { readings: 2, unreadable: 1 }],
  ['only commas', ',,,,,,,', { readings: 2, unreadable: 1 }],
  ['60,000 commas', ','.repeat(60_000), { readings: 2, unreadable: 1 }],
  ['empty cells', ',,', { readings: 2, 'bad-time': 1 }],
  ['the header once more', 'time,signal,value', { readings: 2, 'bad-time': 1 }],
  ['text behind a closing quotation mark', `${t},"A"B,1`, { readings: 2, unreadable: 1 }],
  ['a quotation mark inside a bare cell', `${t},A"B,1`, { readings: 3 }],
  ['a quotation mark that is not closed', `${t},"A,1`, { readings: 2, unreadable: 1 }],
  ['three quotation marks', `${t},""",1`, { readings: 2, unreadable: 1 }],
  ['four quotation marks are one', `${t},"""",1`, { readings: 3 }],
  ['an empty quoted signal', `${t},"",1`, { readings: 2, 'bad-signal': 1 }],
  ['a line feed in the signal', `${t},"A\nB",1`, { readings: 2, 'bad-signal': 1 }],
  ['a comma in the signal', `${t},"A,B",1`, { readings: 3 }],
  ['semicolons', `${t};A;1`, { readings: 2, unreadable: 1 }],
  ['tabs', `${t}\tA\t1`, { readings: 2, unreadable: 1 }],
  ['a decimal comma', `${t},A,1,5`, { readings: 2, unreadable: 1 }],
  ['a quoted decimal comma', `${t},A,"1,5"`, { readings: 2, 'bad-value': 1 }],
  ['NaN', `${t},A,NaN`, { readings: 2, 'bad-value': 1 }],
  ['inf', `${t},A,inf`, { readings: 2, 'bad-value': 1 }],
  ['1e400', `${t},A,1e400`, { readings: 2, 'bad-value': 1 }],
  ['no value', `${t},A,`, { readings: 2, 'bad-value': 1 }],
  ['NA', `${t},A,NA`, { readings: 2, 'bad-value': 1 }],
  ['a spreadsheet error', `${t},A,#DIV/0!`, { readings: 2, 'bad-value': 1 }],
  ['a formula', `${t},A,=1+1`, { readings: 2, 'bad-value': 1 }],
  ['a currency', `${t},A,$5`, { readings: 2, 'bad-value': 1 }],
  ['a percentage', `${t},A,5%`, { readings: 2, 'bad-value': 1 }],
  ['a time in an exponent', `1.7e12,A,1`, { readings: 2, 'bad-time': 1 }],
  ['a time of 50 digits', `${'9'.repeat(50)},A,1`, { readings: 2, 'bad-time': 1 }],
  ['a date where milliseconds are stated', '2026-11-02,A,1', { readings: 2, 'bad-time': 1 }],
  ['NUL bytes in the value', `${t},A,1\0`, { readings: 2, 'bad-value': 1 }],
  ['NUL bytes in the signal', `${t},A\0,1`, { readings: 2, 'bad-signal': 1 }],
  ['a CR in the middle of a cell', `${t},A\rB,1`, { readings: 2, 'bad-signal': 1 }],
  ['a negative price', `${t},A,-1`, { readings: 3 }],
  ['blanks around cells', ` ${t} , A , 1 `, { readings: 3 }],
  ['blanks within quotation marks', `${t}," A ",1`, { readings: 3 }],
]

const longHeaders: readonly Case[] = [
  ['no header', `${t},A,1\n`, { error: 'feed-columns' }],
  ['a header of other names', 'when,what,how much\n', { error: 'feed-columns' }],
  ['a header in capitals', `TIME,SIGNAL,VALUE\n${t},A,1\n`, { error: 'feed-columns' }],
  ['a header with semicolons', `time;signal;value\n${t};A;1\n`, { error: 'feed-columns' }],
  ['the value column twice', `time,signal,value,value\n${t},A,1,2\n`, { error: 'feed-columns' }],
  ['another column twice does no harm', `x,time,signal,value,x\n,${t},A,1,\n`, { readings: 1 }],
  ['quoted names', `"time","signal","value"\n${t},A,1\n`, { readings: 1 }],
  ['a header and nothing else', 'time,signal,value\n', {}],
  ['CR alone as line end', `time,signal,value\r${t},A,1\r`, { error: 'feed-columns' }],
  ['JSON', '{"time":1,"signal":"A","value":1}\n', { error: 'feed-columns' }],
]

const wide: readonly Case[] = [
  ['only NA and nothing', `date,A,B\n2026-11-02,NA,\n2026-11-03,,NA\n`, {}],
  ['NaN, null, - and n/a', `date,A,B,C,D,E\n2026-11-02,NaN,null,-,n/a,1\n`, { readings: 1, 'bad-value': 4 }],
  ['a ragged row', `date,A,B\n2026-11-02,1\n2026-11-03,1,2\n`, { readings: 2, unreadable: 1 }],
  ['a column without a name', `date,,B\n2026-11-02,1,2\n`, { readings: 1, 'bad-signal': 1 }],
  [
    'a column name with a control character',
    `date,"A\nB",C\n2026-11-02,1,2\n`,
    { readings: 1, 'bad-signal': 1 },
  ],
  [
    'a column name of 300 characters',
    `date,${'x'.repeat(300)},B\n2026-11-02,1,2\n`,
    { readings: 1, 'bad-signal': 1 },
  ],
  ['a column twice', 'date,A,A\n2026-11-02,1,2\n', { error: 'feed-columns' }],
  ['two columns without names', 'date,,\n2026-11-02,1,2\n', { error: 'feed-columns' }],
  [
    'a bad date spoils its row only',
    'date,A,B\n2026-02-30,1,2\n2026-11-02,1,2\n',
    { readings: 2, 'bad-time': 1 },
  ],
  ['no signal at all', 'date\n2026-11-02\n', {}],
  ['a column called __proto__', 'date,__proto__,constructor\n2026-11-02,1,2\n', { readings: 2 }],
  ['a total in the last row', 'date,A,B\n2026-11-02,1,2\nTotal,1,2\n', { readings: 2, 'bad-time': 1 }],
  ['a title above the header', 'Closing prices\n\ndate,A\n2026-11-02,1\n', { error: 'feed-columns' }],
  [
    '9,000 columns',
    `date,${Array.from({ length: 9000 }, (_, i) => `S${i}`)}\n2026-11-02,${Array(9000).fill(1)}\n`,
    { readings: 9000 },
  ],
]

export const csvGroups: readonly CaseGroup[] = [
  {
    title: 'CSV long',
    format: { csv: 'long', time: 'time', signal: 'signal', value: 'value', unit: 'ms' },
    cases: [...rows.map(([title, text, expected]): Case => [title, row(text), expected]), ...longHeaders],
  },
  { title: 'CSV wide', format: { csv: 'wide', time: 'date', unit: 'rfc3339' }, cases: wide },
]
