import { describe, expect, it } from 'vitest';
import { npyTable } from '../../src/files/npyTable.js';

describe('npyTable', () => {
  // python3 -c "import io, numpy; f = io.BytesIO(); numpy.save(f, numpy.array([[1, -0.0], [numpy.nan,
  // 5e-324], [3, 4]])); print(f.getvalue().hex())" NumPy 2.4.6.
  const byNumPy =
    '934e554d5059010076007b276465736372273a20273c6638272c2027666f727472616e5f6f72646572273a2046616c73652c2027' +
    '7368617065273a2028332c2032292c207d' +
    '20'.repeat(58) +
    '0a000000000000f03f0000000000000080000000000000f87f010000000000000000000000000008400000000000001040';

  it('writes the bytes that numpy.save writes', () => {
    const bytes = npyTable(3, 2, Float64Array.of(1, -0, NaN, 5e-324, 3, 4));
    expect(Buffer.from(bytes).toString('hex')).toBe(byNumPy);
  });

  it('refuses a table that does not come out even', () => {
    expect(() => npyTable(2, 2, new Float64Array(3))).toThrow(RangeError);
  });
});
