
(function () {
  "use strict";
  var table = document.getElementById("reader-table");
  var controls = document.querySelector(".controls");
  if (!table || !controls) return;
  var body = table.tBodies[0];
  var rows = Array.prototype.slice.call(body.rows);
  var find = document.getElementById("find");
  var choose = document.getElementById("choose");
  var shown = document.getElementById("shown");
  var words = new Intl.Collator(undefined, { numeric: true });

  function value(row, column, kind) {
    var cell = row.cells[column];
    if (kind === "text") return cell.textContent.trim();
    return cell.dataset.value === "" ? null : Number(cell.dataset.value);
  }

  function sort(head, column) {
    var down = head.getAttribute("aria-sort") === "ascending";
    var kind = head.dataset.sort;
    Array.prototype.forEach.call(table.tHead.rows[0].cells, function (other) {
      other.removeAttribute("aria-sort");
    });
    head.setAttribute("aria-sort", down ? "descending" : "ascending");
    rows.sort(function (one, other) {
      var a = value(one, column, kind);
      var b = value(other, column, kind);
      if (a === null || b === null) return (a === null) - (b === null);
      var order = kind === "text" ? words.compare(a, b) : a - b;
      return down ? -order : order;
    });
    rows.forEach(function (row) { body.appendChild(row); });
  }

  function filter() {
    var wanted = find.value.trim().toLowerCase();
    var left = 0;
    rows.forEach(function (row) {
      var fits = row.cells[0].textContent.toLowerCase().indexOf(wanted) >= 0;
      if (choose.value === "out") fits = fits && row.hasAttribute("data-out");
      if (choose.value === "lost") fits = fits && row.hasAttribute("data-lost");
      row.hidden = !fits;
      left += fits ? 1 : 0;
    });
    shown.textContent = left + " of " + rows.length + " readers";
  }

  Array.prototype.forEach.call(table.tHead.rows[0].cells, function (head, column) {
    if (!head.dataset.sort) return;
    var button = document.createElement("button");
    button.type = "button";
    while (head.firstChild) button.appendChild(head.firstChild);
    button.addEventListener("click", function () { sort(head, column); });
    head.appendChild(button);
  });
  find.addEventListener("input", filter);
  choose.addEventListener("change", filter);
  window.addEventListener("beforeprint", function () {
    document.querySelectorAll("details:not(.ready-one)").forEach(function (one) { one.open = true; });
  });
  controls.hidden = false;
  filter();
})();
