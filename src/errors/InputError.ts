/** Where in the input a fault lies; every field counts from 1, as a person does. */
export interface Place {
  /** File name, or the words `standard input`, or an expression. */
  readonly source?: string;
  readonly row?: number;
  readonly column?: number;
  /** Path of a field in a JSON document, such as `measuredCells[2].couplingRatio[0]`. */
  readonly field?: string;
}

/**
 * A fault in what the caller handed in. `message` says in one line what is wrong and where, `remedy` in one
 * line how to mend it; `code` is stable (`folder/what`), for programs that react to it.
 */
export class InputError extends Error {
  override readonly name = 'InputError';
  readonly code: string;
  readonly remedy: string;
  readonly place: Place;

  constructor(code: string, what: string, remedy: string, place: Place = {}, options?: ErrorOptions) {
    super(oneLine(describePlace(place) + what), options);
    this.code = code;
    this.remedy = oneLine(remedy);
    this.place = place;
  }

  /**
   * The same fault, with the source named: readers of bytes do not know the file's name, their callers do.
   */
  withSource(source: string): InputError {
    if (this.place.source !== undefined) return this;
    const bare = this.message.slice(oneLine(describePlace(this.place)).length).trimStart();
    return new InputError(this.code, bare, this.remedy, { ...this.place, source }, { cause: this });
  }
}

function describePlace({ source, row, column, field }: Place): string {
  const parts: string[] = [];
  if (source !== undefined) parts.push(source);
  if (row !== undefined) parts.push(`row ${row}`);
  if (column !== undefined) parts.push(`column ${column}`);
  if (field !== undefined) parts.push(field);
  return parts.length === 0 ? '' : `${parts.join(', ')}: `;
}

/** Untrusted text may hold line breaks and control characters; an error is one line whatever it quotes. */
function oneLine(text: string): string {
  return text.replace(/[\p{Cc}\u2028\u2029]+/gu, ' ').trimEnd();
}
