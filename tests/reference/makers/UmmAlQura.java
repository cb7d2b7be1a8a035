// The first day of every month of the Umm al-Qura calendar as java.time carries it, 1300-1600.
// Prints "# source" and then "year,month,starts" lines.

import java.time.LocalDate;
import java.time.chrono.HijrahChronology;
import java.time.chrono.HijrahDate;
import java.time.temporal.ChronoField;

class UmmAlQura {
    public static void main(String[] arguments) {
        System.out.println("# java.time.chrono.HijrahChronology (" + HijrahChronology.INSTANCE.getId() + "), in Java "
            + Runtime.version().feature());
        for (int year = 1300; year <= 1600; year++) {
            for (int month = 1; month <= 12; month++) {
                HijrahDate first = HijrahChronology.INSTANCE.date(year, month, 1);
                System.out.println(year + "," + month + "," + LocalDate.ofEpochDay(first.getLong(ChronoField.EPOCH_DAY)));
            }
        }
    }
}
