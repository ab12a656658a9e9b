(function () {
  "use strict";
  var words = new Intl.Collator(undefined, { numeric: true });

  function value(row, column, kind) {
    // A row that stands for variants not shown has a place in the order of the page only.
    if (row.hasAttribute("data-gap") && column > 0) return null;
    var cell = row.cells[column];
    if (kind === "text") return cell.textContent.trim();
    return cell.dataset.value === "" ? null : Number(cell.dataset.value);
  }

  function sort(table, head, column) {
    var down = head.getAttribute("aria-sort") === "ascending";
    var kind = head.dataset.sort;
    Array.prototype.forEach.call(table.tHead.rows[0].cells, function (other) {
      other.removeAttribute("aria-sort");
    });
    head.setAttribute("aria-sort", down ? "descending" : "ascending");
    var body = table.tBodies[0];
    Array.prototype.slice.call(body.rows).sort(function (one, other) {
      // The study stays where it is looked for, whatever the others are sorted by.
      var first = other.hasAttribute("data-first") - one.hasAttribute("data-first");
      if (first) return first;
      var a = value(one, column, kind);
      var b = value(other, column, kind);
      if (a === null || b === null) return (a === null) - (b === null);
      var order = kind === "text" ? words.compare(a, b) : a - b;
      return down ? -order : order;
    }).forEach(function (row) { body.appendChild(row); });
  }

  document.querySelectorAll("table.sortable").forEach(function (table) {
    Array.prototype.forEach.call(table.tHead.rows[0].cells, function (head, column) {
      if (!head.dataset.sort) return;
      var button = document.createElement("button");
      button.type = "button";
      while (head.firstChild) button.appendChild(head.firstChild);
      button.addEventListener("click", function () { sort(table, head, column); });
      head.appendChild(button);
    });
  });
})();
