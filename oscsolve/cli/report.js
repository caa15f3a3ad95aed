"use strict";
// Headings of the tables marked for it become buttons that sort the rows; numbers as numbers, rows
// that are equal stay in the order in which they are. Without this script the tables are the same.
(function () {
  function key(row, column) {
    var cell = row.cells[column];
    var text = cell.hasAttribute("data-value") ? cell.dataset.value : cell.textContent.trim();
    var number = Number(text);
    return text !== "" && !Number.isNaN(number) ? number : text;
  }

  function compare(a, b) {
    var numbers = typeof a === "number" && typeof b === "number";
    if (numbers) return a - b;
    if (typeof a !== typeof b) return typeof a === "number" ? -1 : 1;
    return a < b ? -1 : a > b ? 1 : 0;
  }

  function sort(table, heads, column) {
    var rising = heads[column].getAttribute("aria-sort") !== "ascending";
    var body = table.tBodies[0];
    var rows = Array.from(body.rows).map(function (row) {
      return { row: row, key: key(row, column) };
    });
    rows.sort(function (a, b) {
      return rising ? compare(a.key, b.key) : compare(b.key, a.key);
    });
    rows.forEach(function (each) { body.appendChild(each.row); });
    heads.forEach(function (head) { head.removeAttribute("aria-sort"); });
    heads[column].setAttribute("aria-sort", rising ? "ascending" : "descending");
  }

  document.querySelectorAll("table.sortable").forEach(function (table) {
    var heads = Array.from(table.tHead.rows[0].cells);
    heads.forEach(function (head, column) {
      var button = document.createElement("button");
      button.type = "button";
      button.title = "sort by this column";
      while (head.firstChild) button.appendChild(head.firstChild);
      head.appendChild(button);
      button.addEventListener("click", function () { sort(table, heads, column); });
    });
  });

  // On paper everything is shown; on the screen the reader decides.
  var closed = [];
  window.addEventListener("beforeprint", function () {
    closed = Array.from(document.querySelectorAll("details:not([open])"));
    closed.forEach(function (each) { each.open = true; });
  });
  window.addEventListener("afterprint", function () {
    closed.forEach(function (each) { each.open = false; });
  });
})();
