// CSV in and out (RFC 4180), read in blocks so that a file of any size never stands in memory as a whole.

/** Guess the separator of a header line: comma, semicolon or tab. */
export function separatorOf(line) {
  const counts = [",", ";", "\t"].map((sign) => [sign, fieldsOf(line, sign).length]);
  return counts.reduce((best, one) => (one[1] > best[1] ? one : best))[0];
}

/** Return the fields of one record. */
export function fieldsOf(record, separator) {
  if (!record.includes('"')) return record.split(separator);
  const fields = [];
  let field = "";
  let quoted = false;
  for (let n = 0; n < record.length; n += 1) {
    const sign = record[n];
    if (quoted) {
      if (sign !== '"') field += sign;
      else if (record[n + 1] === '"') (field += '"'), (n += 1);
      else quoted = false;
    } else if (sign === '"') quoted = true;
    else if (sign === separator) fields.push(field), (field = "");
    else field += sign;
  }
  fields.push(field);
  return fields;
}

/** Return a record of fields. */
export function recordOf(fields) {
  return fields.map((field) => (/[",\r\n]/.test(field) ? `"${field.replaceAll('"', '""')}"` : field)).join(",");
}

/**
 * Give the records of a file, in blocks of at most `most`: {records, lines}, with the line of the file on which each begins.
 * Empty lines are left out.
 */
export async function* recordsOf(file, most, signal) {
  const reader = file.stream().pipeThrough(new TextDecoderStream()).getReader();
  let rest = "";
  let block = { records: [], lines: [] };
  let number = 0;
  let first = true;
  try {
    for (;;) {
      signal?.throwIfAborted();
      const { done, value } = await reader.read();
      let text = rest + (value || "");
      if (first) text = text.replace(/^\uFEFF/, "");
      first = false;
      const lines = text.split(/\r\n|\n|\r(?!$)/);
      rest = done ? "" : lines.pop();
      let open = "";
      let begins = 0;
      for (const line of lines) {
        number += 1;
        if (!open) begins = number;
        // a quoted field may hold a line break: the record ends where its quotes are even
        const record = open ? `${open}\n${line}` : line;
        if (record.includes('"') && (record.split('"').length - 1) % 2) {
          open = record;
          continue;
        }
        open = "";
        if (record.trim() === "") continue;
        block.records.push(record);
        block.lines.push(begins);
        if (block.records.length === most) {
          yield block;
          block = { records: [], lines: [] };
        }
      }
      if (open) {
        if (done) {
          block.records.push(open);
          block.lines.push(begins);
        } else {
          rest = `${open}\n${rest}`;
          number = begins - 1;
        }
      }
      if (done) break;
    }
    if (block.records.length) yield block;
  } finally {
    reader.cancel().catch(() => {});
  }
}
