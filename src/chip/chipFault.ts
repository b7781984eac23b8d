import { InputError } from '../errors/InputError.js';

/** A fault in a field of a chip file; an empty field stands for the file as a whole. */
export function chipFault(field: string, what: string, remedy: string): InputError {
  return new InputError('chip/invalid', what, remedy, field === '' ? {} : { field });
}
