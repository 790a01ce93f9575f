"""Time stepping on schedules that are fixed once for a study."""
